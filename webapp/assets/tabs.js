// The pages below the bench, one at a time.

import { byId } from "./dom.js"

const tabs = () => [...document.querySelectorAll('[role="tab"]')]

export function startTabs() {
  for (const tab of tabs()) {
    tab.addEventListener("click", () => showPage(tab.getAttribute("aria-controls")))
    tab.addEventListener("keydown", step)
  }
}

export const shownPage = () => tabs().find((tab) => tab.ariaSelected === "true").getAttribute("aria-controls")

export function showPage(name) {
  for (const tab of tabs()) {
    const here = tab.getAttribute("aria-controls") === name
    tab.setAttribute("aria-selected", String(here))
    tab.tabIndex = here ? 0 : -1
    byId(tab.getAttribute("aria-controls")).hidden = !here
  }
}

function step(event) {
  const way = { ArrowRight: 1, ArrowLeft: -1 }[event.key]
  if (!way) return
  event.preventDefault()
  const all = tabs()
  const next = all[(all.indexOf(event.target) + way + all.length) % all.length]
  showPage(next.getAttribute("aria-controls"))
  next.focus()
}
