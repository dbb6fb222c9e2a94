// Two to six side by side: what differs, and what became of each margin.

function head(columns, first) {
  return node("thead", {}, node("tr", {}, node("th", {scope: "col"}, first), ...columns.map((one) =>
    node("th", {scope: "col"},
      drawn("svg", {viewBox: "0 0 28 8", width: 28, height: 8, "aria-hidden": "true"},
        drawn("path", {d: "M0 4 L28 4", style: `stroke: ${one.colour}; stroke-width: 2.5`, "stroke-dasharray": one.dash})),
      node("b", {}, ` ${one.letter} `), one.name, node("small", {}, ` ${one.when}`)))))
}

function label(row) {
  return node("th", {scope: "row"}, row.label, row.unit ? node("small", {}, ` ${row.unit}`) : null)
}

function margin(cell) {
  if (cell === null) return node("td", {}, "–")
  return node("td", {class: cell.verdict, title: cell.reason},
    node("span", {class: "value"}, cell.value, node("small", {}, ` ${cell.limit}`)),
    node("span", {class: "verdict"}, icon(cell.verdict), ` ${cell.verdict}`))
}

export function render({model}) {
  const problem = node("span", {class: "problem", role: "alert"})
  const sender = new Sender(model, (answer) => { problem.textContent = (answer && answer.problem) || "" })
  const root = node("section", {class: "comparison", "aria-label": "Comparison"})
  const fillRoot = once(({columns, inputs, margins}) => {
    const back = node("button", {type: "button", class: "text", onclick: () => sender.send({back: true})}, "Back to the list")
    const rows = inputs.map((row) => node("tr", {}, label(row), ...row.cells.map((cell) => node("td", {}, cell))))
    root.replaceChildren(
      node("div", {class: "actions"}, back,
        node("button", {type: "button", class: "text", onclick: () => sender.send({report: true})}, icon("report"), " Report that compares these"), problem),
      node("table", {}, head(columns, "Margins"),
        node("tbody", {}, ...margins.map((row) => node("tr", {}, label(row), ...row.cells.map(margin))))),
      inputs.length
        ? node("table", {}, head(columns, "Inputs that differ"), node("tbody", {}, ...rows))
        : node("p", {class: "note"}, "No input differs."),
      node("p", {class: "note"}, "In the plots, the thinner a line, the less sure: extrapolated, then indicative beyond stall."))
  })
  const show = () => fillRoot(model.data)
  model.on("data", show)
  show()
  return root
}
