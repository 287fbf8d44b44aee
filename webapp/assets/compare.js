// Compare: stacks laid over the one on the bench, and the table of what differs.

import { byId, element, iconButton } from "./dom.js"
import { browse } from "./files.js"

let send = () => {}

export function startCompare(sender) {
  send = sender
  byId("lay-present").addEventListener("click", () => send("lay"))
  byId("lay-file").addEventListener("click", () => browse("Lay a scenario over the bench", ({ name, demo }) => send("lay", { name, demo })))
}

export function drawCompare({ names, colours, rows, fault }) {
  byId("compare-fault").textContent = fault
  byId("compare-fault").hidden = !fault
  byId("compare-scroll").hidden = !rows.length
  byId("compare-names").replaceChildren(element("td", {}), ...names.map((name, place) => {
    const key = element("i", { class: "stroke", "aria-hidden": "true" })
    key.style.color = colours[place]
    key.dataset.dash = place
    return element("th", { scope: "col" }, key, name, place
      ? iconButton("remove", `Take ${name} away`, { onclick: () => send("unlay", { place: place - 1 }) }) : null)
  }))
  byId("compare-rows").replaceChildren(...rows.map(({ name, values, differs }) => element("tr",
    { class: differs ? "differs" : "" }, element("th", { scope: "row" }, name),
    ...values.map((value) => element("td", {}, value)))))
}
