// The figures in the browser: the curve of the slider's position at once, the energy under the pointer in words.

import { byId } from "./dom.js"

let app = null
let wanted = 1

const model = (name) => window.Bokeh.documents[0].get_model_by_name(name)

export function startBench(given) {
  app = given
  model("curve").properties.data.change.connect(chooseCurve)
  for (const name of ["profile", "passes", "lattice", "emergence", "dispersion"]) {
    model(name).on_event("mousemove", ({ y }) => readAt(y, { fromField: false }))
  }
  for (const name of ["margins", "emergence"]) {
    model(name).on_event("tap", ({ x }) => { if (x >= 0.5) app.chosen(Math.round(x)) })
  }
  byId("energy").addEventListener("input", () => readAt(byId("energy").valueAsNumber, { fromField: true }))
  byId("energy").addEventListener("keydown", stepEnergy)
}

export const heldVersion = () => model("rows").tags[0]

// A number of periods: from the slider it is drawn at once out of the rows held here, and the exact curve follows.
export function showPeriods(periods, { fromServer }) {
  // A slider that moves is ahead of the session.
  if (fromServer && !app.knowsSlider()) return
  wanted = periods
  byId("periods-shown").textContent = periods === 1 ? "1 period" : `${periods.toLocaleString("en")} periods`
  byId("pass-verb").textContent = periods === 1 ? "passes" : "pass"
  if (!fromServer) preview(periods)
  chooseCurve()
}

function preview(periods) {
  const rows = model("rows")
  if (!app.mayPreview()) return
  const index = Array.prototype.indexOf.call(rows.data.counts[0], periods)
  if (index < 0) return
  const energy = rows.data.energy[0]
  const log10 = rows.data.rows[0].slice(index * energy.length, (index + 1) * energy.length)
  const held = model("preview")
  model("preview-line").tags = [periods]
  const drawn = model("passes-range").tags[0] === "log" ? log10 : log10.map((decade) => 10 ** decade)
  held.data = { energy, log10, drawn }
}

// The exact curve where it is that of the wanted count; else the held one where that is; else the exact one, dimmed.
function chooseCurve() {
  const exact = model("curve-line").tags[0] === wanted
  const held = !exact && app.mayPreview() && model("preview-line").tags[0] === wanted
  model("preview-line").visible = held
  model("curve-line").visible = !held
}

// The readout.

function stepEnergy(event) {
  const way = { ArrowUp: 1, ArrowDown: -1 }[event.key]
  if (!way) return
  event.preventDefault()
  const range = model("energy-range")
  const step = (range.end - range.start) / (event.shiftKey ? 20 : 400)
  const energy = (byId("energy").valueAsNumber || 0) + way * step
  readAt(energy, { fromField: false })
}

function readAt(energy, { fromField }) {
  if (!Number.isFinite(energy)) return
  if (!fromField) byId("energy").value = energy.toFixed(2)
  model("energy-pointer").location = energy
  byId("values").textContent = [passed(energy), infinite(energy)].filter(Boolean).join("  ·  ")
}

function passed(energy) {
  const line = model("preview-line").visible ? model("preview") : model("curve")
  const log10 = interpolated(line.data.energy, line.data.log10, energy)
  if (log10 === null) return ""
  if (log10 <= -329) return "T = 0"
  const size = log10 > -3 ? (10 ** log10).toPrecision(3) : `10^${log10.toFixed(2)}`
  const lost = interpolated(model("absorbed").data.energy, model("absorbed").data.drawn, energy)
  const share = lost === null ? "" : `, A = ${(model("passes-range").tags[0] === "log" ? 10 ** lost : lost).toPrecision(3)}`
  return `T = ${size} (${(10 * log10).toFixed(1).replace("-", "−")} dB)${share}`
}

function infinite(energy) {
  const { bottom, top, name } = model("bands").data
  const { energy: grid, phase, decay, rejection } = model("bloch").data
  for (let i = 0; i < bottom.length; i += 1) {
    if (energy >= bottom[i] && energy <= top[i]) {
      const turn = interpolated(grid, phase, energy)
      return `${name[i]}, K d = ${turn === null ? "?" : turn.toFixed(3)} π`
    }
  }
  const rate = interpolated(grid, decay, energy)
  const cost = interpolated(grid, rejection, energy)
  return rate === null ? "" : `gap, κd = ${rate.toFixed(3)} (−${cost.toFixed(1)} dB per period)`
}

function interpolated(x, y, at) {
  let low = 0
  let high = x.length - 1
  if (high < 1 || at < x[low] || at > x[high]) return null
  while (high - low > 1) {
    const middle = (low + high) >> 1
    if (x[middle] <= at) low = middle
    else high = middle
  }
  const share = x[high] > x[low] ? (at - x[low]) / (x[high] - x[low]) : 0
  return y[low] + share * (y[high] - y[low])
}
