// Small helpers to build elements. Text only ever enters as text, never as markup.

export const byId = (id) => document.getElementById(id)

// How far work is; `waits`: its place in line, said in place of what it does.
export function drawProgress(id, share, waits) {
  const label = document.querySelector(`label[for="${id}"]`)
  label.dataset.words ??= label.textContent
  label.textContent = waits || label.dataset.words
  byId(id).value = share
}

export function element(tag, properties = {}, ...children) {
  const made = document.createElement(tag)
  for (const [name, value] of Object.entries(properties)) {
    if (value === undefined || value === null || value === false) continue
    if (name === "class") made.className = value
    else if (name in made && !name.startsWith("aria-")) made[name] = value
    else made.setAttribute(name, value === true ? "" : value)
  }
  made.append(...children.filter((child) => child !== null && child !== undefined))
  return made
}

const SHAPES = {
  up: "M8 13V3M3.5 7.5 8 3l4.500 4.500", down: "M8 3v10M3.500 8.500 8 13l4.500-4.500",
  copy: "M5.500 5.500V3h7.500v7.500h-2.500M3 5.500h7.500V13H3z", remove: "M4 4l8 8M12 4l-8 8", close: "M4 4l8 8M12 4l-8 8",
  add: "M8 3v10M3 8h10", undo: "M6 3 3 6l3 3M3 6h6.500a3.500 3.500 0 0 1 0 7H6",
  redo: "M10 3l3 3-3 3M13 6H6.500a3.500 3.500 0 0 0 0 7H10",
  theme: "M8 2.500a5.500 5.500 0 1 0 0 11zM8 2.500v11M8 2.500a5.500 5.500 0 0 1 0 11",
  met: "M3 8.500l3.500 3.500L13 4.500", missed: "M4 4l8 8M12 4l-8 8", none: "M3 8h10", fault: "M8 3v6M8 12v1",
  stopped: "M4.500 4.500h7v7h-7z", working: "M8 3v5l3 2",
}

export function icon(name) {
  const space = "http://www.w3.org/2000/svg"
  const drawing = document.createElementNS(space, "svg")
  drawing.setAttribute("viewBox", "0 0 16 16")
  drawing.setAttribute("aria-hidden", "true")
  const path = document.createElementNS(space, "path")
  path.setAttribute("d", SHAPES[name])
  drawing.append(path)
  return drawing
}

export function iconButton(name, label, properties = {}) {
  return element("button", { type: "button", class: "icon", "aria-label": label, title: label, ...properties }, icon(name))
}
