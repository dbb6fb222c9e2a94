// One choice out of a few, in words; a colour and a mark where they mean one.

const MARKS = {
  line: "M1 8 L15 8",
  circle: "M8 3 A5 5 0 1 0 8.01 3 Z",
  square: "M3.5 3.5 L12.5 3.5 L12.5 12.5 L3.5 12.5 Z",
  triangle: "M8 2.5 L13.5 12.5 L2.5 12.5 Z",
  diamond: "M8 2 L13 8 L8 14 L3 8 Z",
  inverted_triangle: "M8 13.5 L13.5 3.5 L2.5 3.5 Z",
  hex: "M8 2.5 L12.8 5.2 L12.8 10.8 L8 13.5 L3.2 10.8 L3.2 5.2 Z",
  plus: "M8 3 L8 13 M3 8 L13 8",
  x: "M4 4 L12 12 M12 4 L4 12",
}

function swatch(option) {
  if (!option.colour) return null
  return drawn("svg", {viewBox: "0 0 16 16", width: 12, height: 12, "aria-hidden": "true"},
    drawn("path", {d: MARKS[option.mark], fill: "none", stroke: option.colour, "stroke-width": 2}))
}

export function render({model}) {
  const sender = new Sender(model)
  const root = node("div", {class: "pick", role: "group"})
  const fillRoot = once(({label, options, chosen}) => {
    root.setAttribute("aria-label", label)
    root.replaceChildren(node("span", {class: "label"}, label), ...options.map((option) =>
      node("button", {
        type: "button", title: option.title, "aria-pressed": option.key === chosen ? "true" : "false",
        "data-key": option.key, onclick: () => sender.send({choose: option.key}),
      }, swatch(option), option.text)))
  })
  const show = () => fillRoot(model.data)
  model.on("data", show)
  show()
  return root
}
