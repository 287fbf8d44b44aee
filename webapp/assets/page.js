// The page: hears the session, hands each part to the module that draws it, and sends what the user does.

import { byId, drawProgress, element, icon } from "./dom.js"
import { drawRail, periodsFromRail } from "./rail.js"
import { heldVersion, showPeriods, startBench } from "./bench.js"
import { drawRemedies, startRemedies } from "./remedies.js"
import { drawChosen, drawFit, drawLedger, drawMeasured, drawMeasuredFault, drawResonance, startPeaks } from "./peaks.js"
import { drawCompare, startCompare } from "./compare.js"
import { download, drawHandoff, drawLink, drawSheet, startHandoff } from "./handoff.js"
import { showPage, startTabs } from "./tabs.js"
import { comeBack, heard, keep, keptFor, sent, takeUnheard } from "./keep.js"
import { askToSave, drawFiles, drawObjections, startFiles } from "./files.js"

const page = { status: null, pictured: null, sequence: 0, edited: 0, slid: 0, wire: null, unheard: [] }

const EDITS = new Set(["set", "revert", "layer", "window", "duplicate", "delete", "move", "undo", "redo", "open",
  "dropends", "adopt", "measure", "takefit", "restore", "mirror", "double", "thicken", "takesheet", "opentext"])

function send(type, content = {}) {
  page.sequence += 1
  if (EDITS.has(type)) {
    page.edited = page.sequence
    markPending()
  }
  if (type === "slide") page.slid = page.sequence
  if (EDITS.has(type) || type === "slide") sent(type, page.sequence, content)
  page.wire?.send({ type, seq: page.sequence, ...content })
}

// Whether the session knows where the slider is by now.
const knowsSlider = () => page.status !== null && page.slid <= page.status.seq

// The rows the browser holds may be shown only while no edit of the stack is on its way.
function mayPreview() {
  return page.status !== null && page.edited <= page.status.seq && heldVersion() === page.status.version
}

const parts = {
  status(status) {
    const first = page.status === null
    page.status = status
    heard(status.seq)
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
    const kept = keptFor(status.place, status.notice?.about === "save" && !status.notice.fault)
    if (kept && !status.changed) send("restore", kept)
    if (first) for (const { type, content } of page.unheard) send(type, content)
  },
  kept(kept) { keep(page.status.place, kept) },
  rail(rail) { drawRail(rail, send, knowsSlider()) },
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
  compare(compare) { drawCompare(compare) },
  link(link) { drawLink(link) },
  handoff(handoff) { drawHandoff(handoff) },
  download(file) { download(file) },
  sheet(sheet) { drawSheet(sheet) },
  view({ page: name, scale, density }) {
    showPage(name)
    document.querySelector(`input[name=scale][value=${scale}]`).checked = true
    byId("density").checked = density
  },
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
  const shown = notice && ["open", "save", "kept", "view", "sheet"].includes(notice.about)
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
  for (const button of document.querySelectorAll("dialog .close")) button.append(icon("close"))
  byId("help").addEventListener("click", () => byId("help-dialog").showModal())
  setTheme(document.documentElement.dataset.theme)
  byId("undo").addEventListener("click", () => send("undo"))
  byId("redo").addEventListener("click", () => send("redo"))
  byId("cancel").addEventListener("click", () => send("cancel"))
  byId("again").addEventListener("click", () => send("again"))
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
  startCompare(send)
  startHandoff(send)
  startFiles(send, () => page.status)
  document.addEventListener("keydown", shortcuts)
}

function shortcuts(event) {
  const writes = event.target.matches?.("input:not([type=radio], [type=checkbox], [type=range]), textarea, select")
  if (event.key === "?" && !writes && !document.querySelector("dialog[open]")) byId("help-dialog").showModal()
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
  startBench({ send, mayPreview, knowsSlider, chosen: periodsFromRail })
  page.unheard = takeUnheard()
  window.Bokeh.documents[0].on_event("connection_lost", () => {
    byId("lost").hidden = false
    comeBack()
  })
  send("hello", { theme: document.documentElement.dataset.theme })
})

start()
