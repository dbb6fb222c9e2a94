// The journal: snapshots newest first, found, renamed, brought back, compared, carried.

function picture(paths) {
  return drawn("svg", {viewBox: "0 0 160 72", class: "wing", role: "img", "aria-label": "Wing and tail from above"},
    ...paths.map((d) => drawn("path", {
      d, fill: "currentColor", "fill-opacity": 0.12, stroke: "currentColor",
    })))
}

function figureCell(figure) {
  return node("div", {class: `figure ${figure.verdict}`, title: figure.said},
    node("span", {class: "label"}, figure.label),
    node("span", {class: "value"}, figure.value,
      node("span", {class: "verdict"}, icon(figure.verdict), node("span", {class: "unseen"}, figure.verdict))))
}

async function letters(file) {
  const bytes = new Uint8Array(await file.arrayBuffer())
  const parts = []
  // In thirds of three, so that the pieces join without gaps.
  for (let at = 0; at < bytes.length; at += 30000) {
    parts.push(btoa(String.fromCharCode(...bytes.subarray(at, at + 30000))))
  }
  return parts.join("")
}

export function render({model}) {
  const chosen = new Set()
  let editing = ""
  const landed = (answer) => {
    said.textContent = (answer && answer.said) || ""
    problem.textContent = (answer && answer.problem) || ""
    if (answer && !answer.problem) editing = ""
    show()
  }
  const sender = new Sender(model, landed)
  const finder = new Sender(model)

  const search = node("input", {
    type: "search", placeholder: "Search names, notes and sections", autocomplete: "off",
    "aria-label": "Search the journal", maxlength: 200,
    oninput: () => finder.send({search: search.value}),
  })
  const compare = node("button", {
    type: "button", class: "text main", onclick: () => sender.send({compare: ordered()}),
  }, "Compare")
  const now = node("input", {type: "checkbox", onchange: () => pick("now", now.checked)})
  const file = node("input", {
    type: "file", accept: ".toml,.zip", hidden: true, "aria-label": "File to take in",
    onchange: () => take(file.files[0]),
  })
  const said = node("span", {class: "done", role: "status"})
  const problem = node("p", {class: "problem", role: "alert"})
  const undo = node("p", {class: "undo", role: "status"})
  const messages = node("ul", {class: "messages"})
  const count = node("span", {class: "count"})
  const folder = node("code", {})
  const all = node("button", {type: "button", class: "text", onclick: () => sender.send({export_all: true})}, icon("down"), " Export all")
  const list = node("ol", {class: "list"})

  async function take(given) {
    if (!given) return
    file.value = ""
    const {largest} = model.state
    if (given.size > largest) {
      said.textContent = ""
      problem.textContent = `${given.name} has ${(given.size / 1e6).toFixed(1)} MB; at most ${largest / 1e6} MB can be taken in at once, so export fewer snapshots into it.`
      return
    }
    sender.send({import: {name: given.name, data: await letters(given)}})
  }
  const ordered = () => {
    const shown = model.state.snapshots.map((one) => one.id).filter((id) => chosen.has(id))
    const hidden = [...chosen].filter((id) => id !== "now" && !shown.includes(id))
    return [...(chosen.has("now") ? ["now"] : []), ...shown, ...hidden]
  }
  const pick = (id, on) => {
    if (on) chosen.add(id)
    else chosen.delete(id)
    say()
  }
  const say = () => {
    const {most} = model.state
    compare.disabled = chosen.size < 2 || chosen.size > most
    compare.textContent = chosen.size ? `Compare ${chosen.size}` : "Compare"
    compare.title = compare.disabled ? `Choose two to ${most} to compare` : "Lay them side by side"
  }

  function row(one) {
    const box = node("input", {
      type: "checkbox", "aria-label": `Compare ${one.name}`, onchange: () => pick(one.id, box.checked),
    })
    box.checked = chosen.has(one.id)
    const send = (action) => () => sender.send({[action]: one.id})
    const words = editing === one.id ? form(one) : node("div", {class: "words"},
      node("strong", {}, one.name),
      node("span", {class: "when"}, `${one.when} · ${one.sections}`),
      node("p", {class: "note", title: one.note}, one.note))
    return node("li", {"data-id": one.id}, box, picture(one.paths), words,
      node("div", {class: "figures"}, ...one.figures.map(figureCell)),
      node("div", {class: "tools"},
        tool("restore", `Restore ${one.name}: bring it back onto the page`, send("restore")),
        tool("edit", `Rename ${one.name}, or change its note`, () => { editing = one.id; show(); list.querySelector("form input").select() }),
        tool("down", `Export ${one.name} as a file`, send("export")),
        tool("remove", `Delete ${one.name}`, send("remove"))))
  }
  function form(one) {
    const name = node("input", {type: "text", maxlength: 120, "aria-label": "Name of the snapshot"})
    const note = node("textarea", {rows: 2, maxlength: 20000, "aria-label": "Note of the snapshot"})
    name.value = one.name
    note.value = one.note
    const stop = () => { editing = ""; problem.textContent = ""; show() }
    return node("form", {
      class: "words", onsubmit: (event) => {
        event.preventDefault()
        sender.send({rename: {id: one.id, name: name.value, note: note.value}})
      },
      onkeydown: (event) => { if (event.key === "Escape") stop() },
    }, name, note, node("span", {class: "buttons"},
      node("button", {type: "submit", class: "text main"}, "Set"),
      node("button", {type: "button", class: "text", onclick: stop}, "Cancel")))
  }

  const fillList = once(({snapshots, count: every, words: asked}) => {
    for (const id of [...chosen]) {
      if (id !== "now" && asked === "" && every <= snapshots.length && !snapshots.some((one) => one.id === id)) chosen.delete(id)
    }
    const rows = snapshots.map(row)
    if (!rows.length) {
      rows.push(node("li", {class: "empty"}, every
        ? "No snapshot has these words."
        : "Nothing is kept yet. The camera beside the scenario's name keeps what is on the page, with its figures."))
    }
    list.replaceChildren(...rows)
    say()
  })
  const show = () => {
    const state = model.state
    if (!state.snapshots) return
    // A form that is open keeps its place until it is closed.
    if (editing && !state.snapshots.some((one) => one.id === editing)) editing = ""
    if (!(editing && list.querySelector("form"))) fillList({...state, editing})
    folder.textContent = state.folder
    const more = state.found > state.snapshots.length ? `, the first ${state.snapshots.length} shown` : ""
    count.textContent = state.words ? `${state.found} of ${state.count}${more}` : `${state.count}${more}`
    all.disabled = state.count === 0
    undo.replaceChildren(...(state.deleted ? [
      `Deleted “${state.deleted.name}”. `,
      node("button", {type: "button", class: "text", onclick: () => sender.send({undelete: state.deleted.id})}, "Undo"),
    ] : []))
    messages.replaceChildren(...state.messages.map((text) => node("li", {}, text)))
    say()
  }
  model.on("state", show)
  show()
  return node("section", {class: "journal", "aria-label": "Journal"},
    node("div", {class: "actions"}, search, count, compare,
      node("label", {}, now, " with what is on the page now"),
      node("span", {class: "gap"}),
      node("button", {type: "button", class: "text", onclick: () => file.click()}, icon("up"), " Import"), file, all),
    problem, said, undo, messages, list,
    node("p", {class: "where"}, "One plain file a snapshot in ", folder, ": put the folder under version control, or copy it."))
}
