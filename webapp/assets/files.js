// Opening and saving: the list of scenarios, the name to save under, and what saving would lose.

import { byId, element } from "./dom.js"

let send = () => {}
let asked = null
let chosen = null
const MOST_BYTES = 8_000_000

export function startFiles(sender, status) {
  send = sender
  byId("open").addEventListener("click", () => {
    browse("Open a scenario", ({ name, demo }) => send("open", { name, demo }))
    byId("open-warning").hidden = !status()?.changed
  })
  byId("own-button").addEventListener("click", () => byId("own-file").click())
  byId("own-file").addEventListener("change", openOwn)
  byId("save").addEventListener("click", () => askToSave(send, status()))
  byId("save-as").addEventListener("click", () => askForName(status()))
  byId("save-cancel").addEventListener("click", () => byId("save-dialog").close())
  byId("save-form").addEventListener("submit", (event) => {
    event.preventDefault()
    byId("save-dialog").close()
    send("save", { name: byId("save-name").value, agreed: false })
  })
  byId("objections-dialog").addEventListener("close", () => {
    if (byId("objections-dialog").returnValue === "save") send("save", { name: asked, agreed: true })
  })
}

// Let the user choose a scenario; `then` is told which.
export function browse(title, then) {
  chosen = then
  byId("open-title").textContent = title
  byId("open-warning").hidden = true
  byId("open-own").hidden = title !== "Open a scenario"
  byId("files").replaceChildren(element("li", { class: "quiet" }, "Reading the folder"))
  byId("open-dialog").showModal()
  send("browse")
}

async function openOwn() {
  const [file] = byId("own-file").files
  byId("own-file").value = ""
  if (!file) return
  byId("open-dialog").close()
  // One byte too many is enough for the session to say that it is too large.
  send("opentext", { name: file.name, text: await file.slice(0, MOST_BYTES + 1).text() })
}

export function askToSave(sender, status) {
  if (status?.place) sender("save", { name: status.place, agreed: false })
  else askForName(status)
}

function askForName(status) {
  byId("save-name").value = status?.place ?? ""
  byId("save-dialog").showModal()
  byId("save-name").select()
}

export function drawFiles(files, status) {
  const card = ({ name, title, note, problem, demo }) => {
    const opening = () => { byId("open-dialog").close(); chosen({ name, demo }) }
    return element("li", {}, element("button", { type: "button", class: "file", disabled: Boolean(problem),
      "aria-current": !demo && name === status?.place ? "true" : null, onclick: opening },
    element("span", { class: "file-title" }, title), element("span", { class: "file-name" }, name),
    element("span", { class: problem ? "file-problem" : "file-note" }, problem ?? note)))
  }
  const own = files.filter(({ demo }) => !demo)
  const demos = files.filter(({ demo }) => demo)
  const empty = element("li", { class: "quiet" }, "The folder holds no scenario yet; Save as makes one.")
  const heading = element("li", { class: "files-title" }, "Demos to begin with")
  byId("files").replaceChildren(...(own.length ? own.map(card) : [empty]),
    ...(demos.length ? [heading, ...demos.map(card)] : []))
}

export function drawObjections({ name, sentences }) {
  asked = name
  byId("objections").replaceChildren(...sentences.map((sentence) => element("li", {}, sentence)))
  byId("objections-dialog").returnValue = ""
  byId("objections-dialog").showModal()
}
