// The sheets as tabs, and the station that all plots point at.

export function render({model}) {
  const sender = new Sender(model)
  const pointer = new Sender(model)
  const list = node("div", {class: "tablist", role: "tablist", "aria-label": "Sheets"})
  const slider = node("input", {
    type: "range", min: 0, max: 1, step: 0.01, "aria-label": "Station, share of the half-span",
    oninput: () => pointer.send({station: Number(slider.value)}),
  })
  const words = node("output", {})
  const tabs = model.names.map((name) => node("button", {
    type: "button", role: "tab", onclick: () => sender.send({sheet: name}),
  }, name))
  list.append(...tabs)
  list.addEventListener("keydown", (event) => {
    const step = {ArrowRight: 1, ArrowLeft: -1}[event.key]
    if (step === undefined) return
    const at = tabs.findIndex((tab) => tab.getAttribute("aria-selected") === "true")
    const next = tabs[(at + step + tabs.length) % tabs.length]
    next.focus()
    next.click()
    event.preventDefault()
  })

  const show = () => {
    tabs.forEach((tab) => {
      const chosen = tab.textContent === model.active
      tab.setAttribute("aria-selected", chosen ? "true" : "false")
      tab.tabIndex = chosen ? 0 : -1
    })
  }
  const point = () => {
    const {share, text} = model.station
    words.textContent = text
    words.title = text
    slider.setAttribute("aria-valuetext", text)
    if (pointer.idle) slider.value = share
  }
  model.on("active", show)
  model.on("station", point)
  show()
  point()
  return node("div", {class: "row"}, list,
    node("label", {class: "station"}, node("span", {class: "name", title: "Distance from the centre. Point at the wing, or move the slider; a click on a plot holds or frees the place."}, "Station"), slider, words))
}
