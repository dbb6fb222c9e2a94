// Sentences, facts and tables, as text.

const MAKE = {
  title: (block) => node("h3", {}, block.text),
  sentences: (block) => node("ul", {class: "sentences"},
    ...block.items.map((item) => node("li", {}, item))),
  note: (block) => node("p", {class: "note"}, block.text),
  facts: (block) => node("dl", {}, ...block.items.map(([name, value]) =>
    node("div", {}, node("dt", {}, name), node("dd", {}, value)))),
  table: (block) => node("table", {},
    node("thead", {}, node("tr", {}, ...block.head.map((cell) => node("th", {scope: "col"}, cell)))),
    node("tbody", {}, ...block.rows.map((row) => node("tr", {}, ...row.map(cell))))),
}

function cell(value) {
  if (value !== null && typeof value === "object") {
    return node("td", {class: `verdict ${value.verdict}`}, icon(value.verdict), ` ${value.said ?? value.verdict}`)
  }
  return node("td", {}, value)
}

export function render({model}) {
  const root = node("div", {class: "prose"})
  const sender = new Sender(model)
  const fillRoot = once((blocks) => {
    root.replaceChildren(...blocks.map((block) => MAKE[block.kind](block)))
  })
  const show = () => fillRoot(model.blocks)
  model.on("blocks", show)
  show()
  if (model.fold === "") return root
  return node("details", {
    class: "fold", ontoggle: (event) => sender.send({open: event.target.open}),
  }, node("summary", {}, model.fold), root)
}
