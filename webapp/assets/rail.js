// The rail: draws the fields the session describes, and says what is typed there.
//
// A part whose fields are the same as before is only brought up to date, so that the focus stays where it is; a part
// with other fields is drawn anew, and the focus goes back to the control of the same name.

import { byId, element, icon, iconButton } from "./dom.js"
import { showPeriods } from "./bench.js"

let send = () => {}
let drawn = new Map()
let focusNext = null
let dragged = null

export function drawRail(rail, sender, knowsSlider) {
  send = sender
  const place = byId("rail")
  const focused = document.activeElement?.dataset?.key ?? null
  const lost = focusNext ?? focused
  focusNext = null
  place.firstElementChild ?? place.append(periodsPart(rail.periods))
  updatePeriods(rail.periods, knowsSlider)
  for (const [index, part] of rail.parts.entries()) drawPart(place, part, index + 1)
  if (document.documentElement.dataset.view === "only") {
    for (const control of place.querySelectorAll(".part :is(input, select, textarea, button)")) control.disabled = true
  }
  if (lost && document.activeElement?.dataset?.key !== lost) {
    place.querySelector(`[data-key="${CSS.escape(lost)}"]`)?.focus()
  }
}

// The pattern of a part: what must be the same for it to be kept.
function patternOf(part) {
  const fields = (list) => (list ?? []).map(({ path, kind, options }) => [path, kind, options])
  const rows = (list) => (list ?? []).map((row) => [row.path, row.swatch, fields(row.fields), rows(row.rows)])
  return JSON.stringify([fields(part.fields), rows(part.rows), part.acts, part.acts ? part.help : ""])
}

function drawPart(place, part, index) {
  const pattern = patternOf(part)
  const old = drawn.get(part.id)
  if (old?.pattern === pattern) {
    update(old.node, part)
    return
  }
  const open = old ? old.node.open : part.id !== "about"
  const node = element("details", { class: "part", open }, element("summary", {}, element("h2", {}, part.title)),
    part.help ? element("p", { class: "help" }, part.help) : null, ...body(part))
  if (old) old.node.replaceWith(node)
  else place.insertBefore(node, place.children[index] ?? null)
  drawn.set(part.id, { node, pattern })
  update(node, part)
}

function body(part) {
  const fields = part.fields?.length ? [element("div", { class: "fields" }, ...part.fields.map(field))] : []
  const buttons = (part.acts ?? []).map(({ label, type, content, help }) => element("button", { type: "button", class: "add",
    "data-key": `${part.id}#${label}`, title: help ?? "", onclick: () => send(type, content ?? {}) }, label))
  const acts = buttons.length ? [element("div", { class: "adds" }, ...buttons)] : []
  const fault = part.list === undefined && part.message !== undefined
    ? [element("p", { class: "message", "data-list": part.id, role: "alert", hidden: true })] : []
  return [...(part.list === undefined ? [] : list(part)), ...fields, ...acts, ...fault]
}

function list(part) {
  const rows = part.rows.map((row) => drawRow(part, row))
  return [
    element("ol", { class: "rows" }, ...rows),
    element("p", { class: "message", "data-list": part.list, role: "alert", hidden: true }),
    element("div", { class: "adds" }, ...part.adds.map((add) => adding(part, add))),
  ]
}

function adding(part, { label, name }) {
  const window_ = part.list === "target.windows"
  const where = part.title ? `${label}: ${part.title}` : label
  const act = () => {
    focusNext = `${part.list}[${part.rows.length}]${window_ ? ".from_meV" : ".choice"}`
    if (window_) send("window", { kind: name })
    else send("layer", { path: part.list, index: part.rows.length })
  }
  return element("button", { type: "button", class: "add", "aria-label": where, "data-key": `${part.list}+${name}`,
    onclick: act }, icon("add"), label)
}

function drawRow(part, row) {
  const last = row.index === part.rows.length - 1
  const act = (type, label, shape, content, focus, disabled = false) => iconButton(shape, `${label} ${row.name}`, {
    "data-key": `${row.path}#${type}${content.by ?? ""}`, disabled,
    onclick: () => { focusNext = focus; send(type, { path: part.list, index: row.index, ...content }) },
  })
  const at = (index, action) => `${part.list}[${index}]#${action}`
  const [kind, ...others] = row.fields
  const head = element("div", { class: "row-head" },
    element("i", { class: `swatch ${row.swatch ?? "group"}`, "aria-hidden": "true" }),
    element("h3", { class: "visually-hidden" }, row.name), field(kind),
    element("span", { class: "row-acts" },
      act("move", "Move up", "up", { by: -1 }, at(row.index - 1, "move-1"), row.index === 0),
      act("move", "Move down", "down", { by: 1 }, at(row.index + 1, "move1"), last),
      act("duplicate", "Duplicate", "copy", {}, at(row.index + 1, "duplicate")),
      act("delete", "Delete", "remove", {}, at(last ? row.index - 1 : row.index, "delete"))))
  return draggable(part, row, element("li", { class: "row", "aria-label": row.name, "data-row": row.path }, head,
    element("div", { class: "fields" }, ...others.map(field)),
    element("p", { class: "resolved", "data-resolved": row.path, hidden: true }),
    row.rows ? element("div", { class: "nested" }, ...list(row)) : null))
}

// A row is dragged by its head to another place of its own list; the arrows do the same by keyboard.
function draggable(part, row, node) {
  const head = node.querySelector(".row-head")
  head.draggable = true
  head.addEventListener("dragstart", (event) => {
    event.stopPropagation()
    event.dataTransfer.setData("text/plain", row.path)
    event.dataTransfer.effectAllowed = "move"
    dragged = { list: part.list, index: row.index }
  })
  const here = () => dragged?.list === part.list && dragged.index !== row.index
  node.addEventListener("dragover", (event) => {
    if (!here()) return
    event.preventDefault()
    event.stopPropagation()
    node.dataset.drop = dragged.index < row.index ? "after" : "before"
  })
  node.addEventListener("dragleave", () => { delete node.dataset.drop })
  node.addEventListener("drop", (event) => {
    delete node.dataset.drop
    if (!here()) return
    event.preventDefault()
    event.stopPropagation()
    send("move", { path: part.list, index: dragged.index, by: row.index - dragged.index })
    dragged = null
  })
  return node
}

// One field: label, control, unit, help and message, tied together for those who do not see them.

function field(view) {
  const id = `field-${view.path}`
  const message = element("p", { class: "message", id: `${id}-message`, "data-message": view.path, hidden: true })
  const help = view.help ? element("span", { class: "visually-hidden", id: `${id}-help` }, view.help) : null
  const control = makers[view.kind](view, id)
  control.dataset.key = view.path
  control.setAttribute("aria-describedby", `${id}-message${help ? ` ${id}-help` : ""}`)
  if (view.help) control.title = view.help
  const label = element("label", { htmlFor: id, class: view.is_unit ? "visually-hidden" : "" }, view.label)
  const unit = view.unit ? element("span", { class: "unit" }, view.unit) : null
  const classes = `field ${view.kind}${view.is_unit ? " is-unit" : ""} of-${view.path.split(".").pop()}`
  return element("div", { class: classes }, label, element("span", { class: "box" }, control, unit), help, message)
}

const makers = {
  number: (view, id) => textual(element("input", { id, type: "text", inputMode: "decimal", autocomplete: "off",
    spellcheck: false }), view),
  text: (view, id) => textual(element("input", { id, type: "text", autocomplete: "off" }), view),
  area: (view, id) => textual(element("textarea", { id, rows: 5 }), view),
  select(view, id) {
    const control = element("select", { id },
      ...view.options.map(([value, label]) => element("option", { value }, label)))
    control.addEventListener("change", () => send("set", { path: view.path, text: control.value }))
    return control
  },
  check(view, id) {
    const control = element("input", { id, type: "checkbox" })
    control.addEventListener("change", () => send("set", { path: view.path, text: String(control.checked) }))
    return control
  },
}

// While something is typed the session's answers leave the control alone, and Ctrl+Z is the browser's own.
function textual(control, view) {
  control.addEventListener("input", () => { control.dataset.typing = "yes" })
  control.addEventListener("change", () => {
    delete control.dataset.typing
    send("set", { path: view.path, text: control.value })
  })
  control.addEventListener("blur", () => { delete control.dataset.typing })
  control.addEventListener("keydown", (event) => {
    if (event.key !== "Escape") return
    delete control.dataset.typing
    control.value = control.dataset.valid
    send("revert", { path: view.path })
  })
  return control
}

function update(node, part) {
  for (const view of part.fields ?? []) updateField(node, view)
  if (part.message !== undefined) {
    updateMessage(node.querySelector(`[data-list="${CSS.escape(part.list ?? part.id)}"]`), part.message)
  }
  for (const row of part.rows ?? []) {
    update(node, row)
    const line = node.querySelector(`[data-resolved="${CSS.escape(row.path)}"]`)
    line.textContent = [row.resolved, ...(row.warnings ?? [])].filter(Boolean).join(". ")
    line.hidden = !line.textContent
  }
}

function updateField(node, view) {
  const control = node.querySelector(`[data-key="${CSS.escape(view.path)}"]`)
  if (view.kind === "check") control.checked = view.value === "true"
  else if (control.dataset.typing !== "yes") control.value = view.value
  control.dataset.valid = view.valid
  control.setAttribute("aria-invalid", String(Boolean(view.message)))
  updateMessage(node.querySelector(`[data-message="${CSS.escape(view.path)}"]`), view.message)
}

function updateMessage(place, sentence) {
  place.textContent = sentence
  place.hidden = !sentence
}

// The periods: a slider for dragging and a box for the exact number.

function periodsPart(view) {
  const slider = element("input", { type: "range", id: "period-slider", min: 1, step: 1, "aria-label": "Number of periods" })
  slider.addEventListener("input", () => {
    send("slide", { periods: Number(slider.value) })
    showPeriods(Number(slider.value), { fromServer: false })
    const box = byId(`field-${view.path}`)
    box.value = box.dataset.valid = slider.value
  })
  for (const end of ["pointerup", "keyup", "blur"]) slider.addEventListener(end, () => send("settle"))
  return element("section", { class: "count", "aria-label": "Periods" },
    field({ ...view, label: "periods of the cell", kind: "number" }), slider,
    element("span", { class: "ends", "aria-hidden": "true" }, element("span", {}, "1"), element("span", { id: "most" })))
}

function updatePeriods(view, knowsSlider) {
  const slider = byId("period-slider")
  slider.max = view.most
  byId("most").textContent = view.most
  if (knowsSlider) slider.value = view.count
  updateField(byId("rail"), { ...view, kind: "number" })
}

// A number of periods chosen elsewhere: a click into a figure.
export function periodsFromRail(periods) {
  send("set", { path: "stack.periods", text: String(periods) })
}
