// Ties the session's messages to the page. The page's own modules are loaded by the document.
export function render({ model }) {
  document.dispatchEvent(new CustomEvent("colonnade:wire", { detail: {
    send: (message) => model.send_msg(message),
    listen: (heard) => model.on("msg:custom", (text) => heard(JSON.parse(text))),
  } }))
}
