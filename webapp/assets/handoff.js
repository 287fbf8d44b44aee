// Hand-off: a link, files made by the session, pictures made here, and a layer sheet that comes in.

import { byId, element } from "./dom.js"
import { shownPage } from "./tabs.js"

const MOST_BYTES = 1_000_000
let send = () => {}

export function startHandoff(sender) {
  send = sender
  byId("link-make").addEventListener("click", () => send("link", { page: shownPage() }))
  for (const button of document.querySelectorAll("[data-export]")) {
    button.addEventListener("click", () => send("export", { what: button.dataset.export, rates: byId("rates").value }))
  }
  byId("figure-svg").addEventListener("click", () => picture("svg"))
  byId("figure-png").addEventListener("click", () => picture("png"))
  byId("sheet-read").addEventListener("click", look)
  byId("sheet-file-button").addEventListener("click", () => byId("sheet-file").click())
  byId("sheet-file").addEventListener("change", readFile)
  byId("sheet-take").addEventListener("click", () => send("takesheet", { path: byId("sheet-part").value }))
}

export function drawLink({ text, sentence }) {
  const field = byId("link-text")
  field.hidden = !text
  byId("link-sentence").textContent = sentence
  byId("link-sentence").dataset.fault = String(Boolean(sentence))
  if (!text) return
  field.value = `${location.origin}${location.pathname}?bench=${text}`
  field.select()
  navigator.clipboard?.writeText(field.value).then(
    () => { byId("link-sentence").textContent = `Copied, ${field.value.length.toLocaleString("en")} characters.` },
    () => { byId("link-sentence").textContent = "Selected: copy it with Ctrl+C." })
}

export function drawHandoff({ state, sentence }) {
  byId("handoff-sentence").textContent = state === "working" ? "Working it out." : sentence
  byId("handoff-sentence").dataset.fault = String(state === "fault")
}

export function download({ name, media, text }) {
  save(new Blob([text], { type: media }), name)
}

function save(blob, name) {
  const link = element("a", { href: URL.createObjectURL(blob), download: name })
  link.click()
  setTimeout(() => URL.revokeObjectURL(link.href), 10_000)
}

async function picture(kind) {
  const name = byId("figure-choice").value
  const view = window.Bokeh.index.find_one(window.Bokeh.documents[0].get_model_by_name(name))
  const canvas = view.export(kind === "svg" ? "svg" : "png", true)
  const blob = kind === "svg"
    ? new Blob([canvas.ctx.get_serialized_svg(true)], { type: "image/svg+xml" }) : await canvas.to_blob()
  save(blob, `colonnade-${name}.${kind}`)
}

function look() {
  send("sheet", { text: byId("sheet-text").value, unit: byId("sheet-unit").value || null })
}

async function readFile() {
  const [file] = byId("sheet-file").files
  byId("sheet-file").value = ""
  if (!file) return
  if (file.size > MOST_BYTES) {
    drawSheet({ sentence: "", faults: [`${file.name} is larger than 1,000,000 bytes; cut it to its layers.`], rows: [], takes: false })
    return
  }
  byId("sheet-text").value = await file.text()
  look()
}

export function drawSheet({ sentence, faults, rows, takes }) {
  byId("sheet-sentence").textContent = sentence
  byId("sheet-faults").replaceChildren(...faults.map((fault) => element("li", {}, fault)))
  byId("sheet-scroll").hidden = !rows.length
  byId("sheet-rows").replaceChildren(...rows.map((row) => element("tr", {}, ...row.map((cell) => element("td", {}, cell)))))
  byId("sheet-takes").hidden = !takes
}
