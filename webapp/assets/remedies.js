// Remedies: the list of proposals, each with a small picture of its band edge, and the way to take one.

import { byId, drawProgress, element } from "./dom.js"
import { showPage } from "./tabs.js"

let send = () => {}

export function startRemedies(sender) {
  send = sender
  byId("match-ends").addEventListener("click", () => propose("ends"))
  byId("find-stacks").addEventListener("click", () => propose("nearest"))
  byId("mend").addEventListener("click", () => {
    propose("nearest")
    showPage("periods")
    byId("remedies").scrollIntoView({ block: "start" })
    byId("find-stacks").focus({ preventScroll: true })
  })
  byId("stop-proposing").addEventListener("click", () => send("stopproposing"))
}

function propose(what) {
  send("propose", { what, whole: byId("whole").checked })
}

export function drawRemedies({ state, sentence, share, waits, proposals }) {
  byId("proposing").hidden = state !== "working"
  drawProgress("proposing-progress", share, waits)
  byId("remedies-sentence").textContent = state === "working" ? "" : sentence
  byId("remedies-sentence").dataset.fault = String(state === "fault")
  byId("proposals").replaceChildren(...proposals.map(card))
}

function card({ words, facts, picture }, index) {
  return element("li", { class: "proposal" }, drawing(picture),
    element("div", {}, element("p", { class: "proposal-words" }, words),
      element("p", { class: "quiet" }, facts.join("  ·  "))),
    element("button", { type: "button", "aria-label": `Take: ${words}`, onclick: () => send("adopt", { index }) }, "Take it"))
}

function drawing({ x, y }) {
  const space = "http://www.w3.org/2000/svg"
  const svg = document.createElementNS(space, "svg")
  svg.setAttribute("viewBox", "0 0 160 48")
  svg.setAttribute("preserveAspectRatio", "none")
  svg.setAttribute("class", "profile-sketch")
  svg.setAttribute("aria-hidden", "true")
  const line = document.createElementNS(space, "polyline")
  line.setAttribute("points", x.map((at, i) => `${(2 + 156 * at).toFixed(1)},${(44 - 40 * y[i]).toFixed(1)}`).join(" "))
  svg.append(line)
  return svg
}
