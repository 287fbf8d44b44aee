// Nothing the user made is lost: edits that no file holds yet are kept in this browser, and brought back.

const tab = sessionStorage.getItem("colonnade-tab") ?? crypto.getRandomValues(new Uint32Array(2)).join("-")
sessionStorage.setItem("colonnade-tab", tab)

const shelf = (place) => `colonnade-kept:${place ?? ""}`
const QUEUE = "colonnade-unheard"

let shown // the place on screen, once something of it is known
let unheard = [] // edits the session has not answered yet

// What the session says is not in a file: text, drafts, and the file as it was read.
export function keep(place, kept) {
  if (!kept) return drop(place)
  const entry = JSON.stringify({ ...kept, tab })
  for (const storage of [sessionStorage, localStorage]) put(storage, shelf(place), entry)
}

// A browser's store is bounded; what does not fit is on screen and with the session all the same.
function put(storage, key, text) {
  try {
    storage.setItem(key, text)
  } catch {
    storage.removeItem(key)
  }
}

function drop(place) {
  sessionStorage.removeItem(shelf(place))
  const other = read(localStorage.getItem(shelf(place)))
  if (!other || other.tab === tab) localStorage.removeItem(shelf(place))
}

// Edits kept for a place that is newly on screen: this tab's own first. `saved`: the place is where they were saved to.
export function keptFor(place, saved) {
  if (place === shown) return null
  if (saved && shown !== undefined) drop(shown)
  shown = place
  const kept = read(sessionStorage.getItem(shelf(place))) ?? read(localStorage.getItem(shelf(place)))
  return kept && { text: kept.text, drafts: kept.drafts, base: kept.base }
}

function read(text) {
  try {
    return text ? JSON.parse(text) : null
  } catch {
    return null
  }
}

// Edits on their way: those never answered are said again to the next session.

export function sent(type, seq, content) {
  if (type === "slide") unheard = unheard.filter((edit) => edit.type !== "slide")
  unheard.push({ type, seq, content })
  shelve()
}

export function heard(seq) {
  unheard = unheard.filter((edit) => edit.seq > seq)
  shelve()
}

export function takeUnheard() {
  const left = read(sessionStorage.getItem(QUEUE)) ?? []
  sessionStorage.removeItem(QUEUE)
  return left
}

function shelve() {
  if (unheard.length) put(sessionStorage, QUEUE, JSON.stringify(unheard))
  else sessionStorage.removeItem(QUEUE)
}

// The connection is gone: ask for the server until it answers, then come back; what was kept comes too.
export function comeBack() {
  const ask = async () => {
    try {
      const answer = await fetch("liveness", { cache: "no-store" })
      if (answer.ok) return location.reload()
    } catch { /* Not there yet. */ }
    setTimeout(ask, 1000)
  }
  setTimeout(ask, 500)
}
