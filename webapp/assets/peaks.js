// Peaks: the ledger as a table to sort and choose from, what moves a resonance, measured peaks, the fit.

import { byId, drawProgress, element } from "./dom.js"

const MOST_BYTES = 1_000_000
let send = () => {}
let ledger = { columns: [], rows: [] }
let chosen = null
let held = null
let order = { column: 0, down: false }

export function startPeaks(sender) {
  send = sender
  byId("density").addEventListener("change", () => send("density", { shown: byId("density").checked }))
  byId("measured-use").addEventListener("click", measure)
  byId("measured-drop").addEventListener("click", () => {
    byId("measured-text").value = ""
    measure()
  })
  byId("measured-file-button").addEventListener("click", () => byId("measured-file").click())
  byId("measured-file").addEventListener("change", readFile)
  byId("fit-start").addEventListener("click", () => {
    const figures = [...byId("fit-figures").querySelectorAll("input:checked")].map((box) => box.value)
    send("fit", { figures })
  })
  byId("fit-stop").addEventListener("click", () => send("stopfit"))
  byId("fit-take").addEventListener("click", () => send("takefit"))
}

// The ledger.

export function drawLedger(news) {
  ledger = news
  chosen = news.chosen
  const fault = news.state === "fault"
  byId("ledger-sentence").textContent = news.sentence
  byId("ledger-sentence").hidden = !fault
  byId("ledger-scroll").hidden = fault
  byId("ledger-seal").textContent = news.certificate
  byId("ledger-seal").dataset.complete = String(news.complete)
  byId("ledger-more").textContent = news.rows.length || fault ? news.bound : "No resonance in this range. " + news.bound
  byId("measured-sentence").textContent = news.measured
  if (order.column >= news.columns.length) order = { column: 0, down: false }
  drawTable()
}

export function drawChosen(place) {
  chosen = place
  for (const row of byId("ledger").tBodies[0].rows) mark(row)
}

function drawTable() {
  byId("ledger").tHead.rows[0].replaceChildren(...ledger.columns.map(header))
  const places = ledger.rows.map((_, place) => place).sort(comparison)
  byId("ledger").tBodies[0].replaceChildren(...places.map(line))
}

function header({ name, help }, column) {
  const sorted = column !== order.column ? "none" : order.down ? "descending" : "ascending"
  return element("th", { scope: "col", "aria-sort": sorted },
    element("button", { type: "button", title: help, onclick: () => {
      order = { column, down: column === order.column && !order.down }
      drawTable()
      byId("ledger").tHead.rows[0].cells[column].firstChild.focus()
    } }, name))
}

function comparison(one, other) {
  const [a, b] = [ledger.rows[one][order.column][0], ledger.rows[other][order.column][0]]
  if (a === null || b === null) return (a === null) - (b === null)
  return order.down ? b - a : a - b
}

function line(place) {
  const cells = ledger.rows[place]
  const row = element("tr", { onclick: () => send("trace", { place }) },
    element("th", { scope: "row" }, element("button", { type: "button", "aria-label": `Resonance ${place + 1} at ${cells[1][1]} meV`,
      onclick: (event) => { event.stopPropagation(); send("trace", { place }) } }, cells[0][1])),
    ...cells.slice(1).map(([, text]) => element("td", {}, text)))
  row.dataset.place = place
  mark(row)
  return row
}

function mark(row) {
  const here = Number(row.dataset.place) === chosen && chosen !== null
  row.classList.toggle("chosen", here)
  row.querySelector("button").setAttribute("aria-pressed", String(here))
}

// One resonance.

export function drawResonance(resonance) {
  byId("resonance-title").textContent = resonance?.title ?? "What moves a peak"
  byId("resonance-facts").textContent = resonance?.facts ?? "Choose a resonance in the ledger."
  byId("traced").textContent = resonance ? "and |ψ|² of a resonance" : ""
  byId("effects-scroll").hidden = !resonance?.effects.length
  const largest = Math.max(...(resonance?.effects ?? []).map(({ shift }) => Math.abs(shift)), Number.MIN_VALUE)
  byId("effects").replaceChildren(...(resonance?.effects ?? []).map(({ layer, figure, shift, energy, width }) => {
    const bar = element("i", { class: shift < 0 ? "bar-of down" : "bar-of", "aria-hidden": "true" })
    bar.style.width = `${(100 * Math.abs(shift)) / largest}%`
    return element("tr", {}, element("th", { scope: "row" }, layer), element("td", {}, figure, bar),
      element("td", { class: "right" }, energy), element("td", { class: "right" }, width))
  }))
}

// Measured peaks.

function measure() {
  send("measure", { text: byId("measured-text").value, lever_arm: byId("lever-arm").value })
}

async function readFile() {
  const [file] = byId("measured-file").files
  byId("measured-file").value = ""
  if (!file) return
  if (file.size > MOST_BYTES) {
    drawMeasuredFault({ about: "measured", sentence: `${file.name} is larger than 1,000,000 bytes; cut the table to its peaks.` })
    return
  }
  byId("measured-text").value = await file.text()
  measure()
}

export function drawMeasured({ text, lever_arm: arm, any }) {
  // What is being typed stays until the session's own table changes.
  if (held?.text !== text) byId("measured-text").value = text
  if (held?.arm !== arm) byId("lever-arm").value = arm
  held = { text, arm }
  byId("measured-drop").hidden = !any
}

export function drawMeasuredFault(notice) {
  const about = notice?.about === "measured"
  byId("measured-fault").hidden = !about
  byId("measured-fault").textContent = about ? notice.sentence : ""
}

// The fit.

export function drawFit({ state, sentence, share, waits, rows, warnings, takes }) {
  byId("fit-working").hidden = state !== "working"
  drawProgress("fit-progress", share, waits)
  byId("fit-sentence").textContent = sentence
  byId("fit-sentence").dataset.fault = String(state === "fault")
  byId("fit-take").hidden = !takes
  byId("fit-table").hidden = !rows.length
  byId("fit-rows").replaceChildren(...rows.map(({ name, change, error }) => element("tr", {},
    element("th", { scope: "row" }, name), element("td", { class: "right" }, change),
    element("td", { class: "right" }, error))))
  byId("fit-warnings").replaceChildren(...warnings.map((warning) => element("li", {}, warning)))
}
