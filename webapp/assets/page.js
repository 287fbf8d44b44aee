// The page: hears the session, hands each part to the module that draws it, and sends what the user does.

import { byId, drawProgress, element, icon } from "./dom.js"
import { drawRail, periodsFromRail } from "./rail.js"
import { heldVersion, showPeriods, startBench } from "./bench.js"
import { drawRemedies, startRemedies } from "./remedies.js"
import { drawChosen, drawFit, drawLedger, drawMeasured, drawMeasuredFault, drawResonance, startPeaks } from "./peaks.js"
import { startTabs } from "./tabs.js"
import { askToSave, drawFiles, drawObjections, startFiles } from "./files.js"

const page = { status: null, pictured: null, sequence: 0, edited: 0, wire: null, palette: null }

const EDITS = new Set(["set", "revert", "layer", "window", "duplicate", "delete", "move", "undo", "redo", "open",
  "dropends", "adopt", "measure", "takefit"])

function send(type, content = {}) {
  page.sequence += 1
  if (EDITS.has(type)) {
    page.edited = page.sequence
    markPending()
  }
  page.wire?.send({ type, seq: page.sequence, ...content })
}

// The rows the browser holds may be shown only while no edit of the stack is on its way.
function mayPreview() {
  return page.status !== null && page.edited <= page.status.seq && heldVersion() === page.status.version
}

const parts = {
  status(status) {
    page.status = status
    byId("place").textContent = status.place ?? "not saved yet"
    byId("changed").hidden = !status.changed
    command("undo", status.undo)
    command("redo", status.redo)
    drawNotice(status.notice)
    drawMeasuredFault(status.notice)
    showPeriods(status.periods, { fromServer: true })
    if (status.place) {
      const address = new URL(location)
      address.searchParams.set("scenario", status.place)
      if (address.href !== location.href) history.replaceState(history.state, "", address)
    }
    markPending()
  },
  rail(rail) { drawRail(rail, send) },
  about({ title, note, cautions, beam }) {
    byId("beam").textContent = beam
    byId("title").textContent = title
    document.title = `${title} · Colonnade`
    byId("note").textContent = note
    byId("cautions").replaceChildren(...cautions.map((sentence) => element("li", {}, sentence)))
    const many = cautions.length === 1 ? "1 caution" : `${cautions.length} cautions`
    byId("more-title").textContent = [note ? "Note" : "", cautions.length ? many : ""].filter(Boolean).join(" and ")
    byId("more").hidden = !note && !cautions.length
  },
  verdict(verdict) {
    const { state, sentence, present, legend } = verdict
    byId("answer").dataset.state = state
    byId("sign").replaceChildren(icon(state))
    byId("working").hidden = state !== "working" || !(verdict.share || verdict.waits)
    drawProgress("progress", verdict.share ?? 0, verdict.waits)
    byId("again").hidden = state !== "stopped"
    if (state === "stopped") byId("sentence").textContent = "The verdict was not worked out."
    else if (sentence) byId("sentence").textContent = sentence
    byId("present").textContent = present
    byId("range-words").textContent = verdict.range?.sentence ?? ""
    byId("range-assumed").textContent = verdict.range?.assumed ?? ""
    byId("range").hidden = !verdict.range
    byId("mend").hidden = state !== "missed"
    byId("legend").replaceChildren(...legend.map(({ colour, kind, name }) => {
      const mark = element("i", { class: `key ${kind}` })
      mark.style.color = colour
      return element("span", {}, mark, name)
    }))
  },
  texts(texts) {
    for (const [name, text] of Object.entries(texts)) {
      const place = byId(name === "certificate" ? name : `text-${name}`)
      if (place) place.textContent = text
    }
  },
  pictured(pictured) {
    page.pictured = pictured
    byId("fault").textContent = pictured.fault
    byId("fault").hidden = !pictured.fault
    document.body.dataset.ready = "yes"
    markPending()
  },
  shown({ range, earlier }) {
    byId("range-drawn").hidden = !range
    byId("earlier").hidden = !earlier
  },
  remedies(remedies) { drawRemedies(remedies) },
  ledger(ledger) { drawLedger(ledger) },
  chosen(place) { drawChosen(place) },
  resonance(resonance) { drawResonance(resonance) },
  measured(measured) { drawMeasured(measured) },
  fit(fit) { drawFit(fit) },
  files(files) { drawFiles(files, page.status) },
  objections(objections) { drawObjections(objections) },
}

function command(id, step) {
  const button = byId(id)
  const word = id === "undo" ? "Undo" : "Redo"
  button.disabled = step === null
  button.title = step === null ? word : `${word}: ${step}`
}

function drawNotice(notice) {
  const shown = notice && (notice.about === "open" || notice.about === "save")
  byId("notice").hidden = !shown
  byId("notice").textContent = shown ? notice.sentence : ""
  byId("notice").dataset.fault = String(Boolean(notice?.fault))
}

// Figures of a stack that is no longer the one in the rail are dimmed until their successors arrive.
function markPending() {
  const { status, pictured } = page
  const current = status && pictured && page.edited <= status.seq && pictured.version === status.version
  byId("trio").toggleAttribute("data-pending", !current)
}

function setTheme(theme) {
  document.documentElement.dataset.theme = theme
  byId("theme").setAttribute("aria-pressed", String(theme === "dark"))
}

function start() {
  for (const id of ["undo", "redo", "theme"]) byId(id).append(icon(id))
  document.querySelector("#open-dialog .close").append(icon("close"))
  setTheme(document.documentElement.dataset.theme)
  byId("undo").addEventListener("click", () => send("undo"))
  byId("redo").addEventListener("click", () => send("redo"))
  byId("cancel").addEventListener("click", () => send("cancel"))
  byId("again").addEventListener("click", () => send("again"))
  byId("reload").addEventListener("click", () => location.reload())
  byId("theme").addEventListener("click", () => {
    const theme = document.documentElement.dataset.theme === "dark" ? "light" : "dark"
    localStorage.setItem("colonnade-theme", theme)
    setTheme(theme)
    send("theme", { theme })
  })
  for (const choice of document.querySelectorAll("input[name=scale]")) {
    choice.addEventListener("change", () => send("scale", { scale: choice.value }))
  }
  startTabs()
  startRemedies(send)
  startPeaks(send)
  startFiles(send, () => page.status)
  document.addEventListener("keydown", shortcuts)
  addEventListener("beforeunload", (event) => { if (page.status?.changed) event.preventDefault() })
}

function shortcuts(event) {
  if (!(event.ctrlKey || event.metaKey) || event.altKey) return
  const key = event.key.toLowerCase()
  if (key === "s") {
    event.preventDefault()
    document.activeElement?.blur?.()
    askToSave(send, page.status)
    return
  }
  const typing = document.activeElement?.dataset?.typing === "yes"
  if (typing || document.querySelector("dialog[open]") || (key !== "z" && key !== "y")) return
  event.preventDefault()
  send(key === "y" || event.shiftKey ? "redo" : "undo")
}

document.addEventListener("colonnade:wire", ({ detail: wire }) => {
  page.wire = wire
  wire.listen((news) => {
    for (const name of Object.keys(parts)) if (name in news) parts[name](news[name])
  })
  startBench({ send, mayPreview, chosen: periodsFromRail })
  send("hello", { theme: document.documentElement.dataset.theme })
})

start()
