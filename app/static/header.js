// Name and note, undo and redo, snapshot, save and report; one row to ask and offer in.

const NAMES = [["name", "Name", 120], ["author", "By", 120], ["note", "Note", 20000]]

// One row in place of the reason: a form, an offer, or what went wrong.
class Ask {
  constructor() {
    this.element = node("div", {class: "ask", hidden: true})
    this.kind = ""
  }

  open(kind, role, ...children) {
    this.kind = kind
    this.element.setAttribute("role", role)
    this.element.replaceChildren(...children)
    this.element.hidden = false
    // An offer waits beside what is said; all else stands in its place.
    this.element.parentElement?.classList.toggle("asking", kind !== "left")
  }

  close() {
    this.kind = ""
    this.element.hidden = true
    this.element.replaceChildren()
    this.element.parentElement?.classList.remove("asking")
  }
}

function makeForm(label, fields, verb, given, give, cancel) {
  const problem = node("p", {class: "problem", role: "alert"})
  const inputs = fields.map(([name, title, most]) => {
    const common = {
      name, maxlength: most, "aria-label": title, placeholder: title, autocomplete: "off",
    }
    const input = name === "note"
      ? node("textarea", {...common, rows: 1})
      : node("input", {...common, type: "text"})
    input.value = given[name]
    return input
  })
  const form = node("form", {
    class: "asked", "aria-label": label,
    onsubmit: (event) => {
      event.preventDefault()
      give(Object.fromEntries(inputs.map((input) => [input.name, input.value])))
    },
    onkeydown: (event) => {
      if (event.key === "Escape") cancel()
      if (event.key === "Enter" && (event.ctrlKey || event.metaKey)) form.requestSubmit()
    },
  },
    ...inputs.map((input, at) => node("label", {class: input.name}, node("span", {}, fields[at][1]), input)),
    node("button", {type: "submit", class: "main"}, verb),
    node("button", {type: "button", onclick: cancel}, "Cancel"),
    problem)
  return {form, problem, first: inputs[0]}
}

function makeHeader(model) {
  const ask = new Ask()
  let form = null, opener = null, lost = false
  const sender = new Sender(model, (answer) => landed(answer))
  const steps = new Sender(model)
  const name = node("h1", {})
  const note = node("p", {class: "note"})
  const mark = node("span", {class: "unsaved", role: "status"})
  const done = node("span", {class: "done", role: "status"})
  const solving = node("span", {class: "solving", role: "status"})

  // Presses while one is under way add up: none is lost.
  const step = (by) => {
    if (steps.waiting) steps.waiting.step += by
    else steps.send({step: by})
  }
  const close = () => {
    form = null
    ask.close()
    if (opener) opener.focus()
    opener = null
    offer()
  }
  const landed = (answer) => {
    if (answer && answer.problem) {
      if (form) form.problem.textContent = answer.problem
      else ask.open("problem", "alert", node("p", {}, answer.problem),
        node("button", {type: "button", onclick: close}, "Close"))
    } else if (answer && form) {
      close()
    }
  }
  const openForm = (label, fields, verb, given, give) => {
    if (lost) return
    opener = focused()
    form = makeForm(label, fields, verb, given, give, close)
    ask.open("form", "group", form.form)
    form.first.focus()
    form.first.select()
  }
  const editNames = () => openForm("Name and note", NAMES, "Set", model.header,
    (texts) => sender.send({texts}))
  const takeSnapshot = () => openForm("Snapshot", [NAMES[0], NAMES[2]], "Keep in the journal",
    {name: model.header.name, note: ""}, (snapshot) => sender.send({snapshot}))

  const tools = {
    undo: tool("undo", "Undo", () => step(-1)),
    redo: tool("redo", "Redo", () => step(1)),
    snapshot: tool("snapshot", "Snapshot: keep this in the journal", takeSnapshot),
    save: tool("save", "Save", () => sender.send({save: true})),
    copy: tool("down", "Save a copy: a file with the scenario and its tables", () => sender.send({copy: true})),
    report: tool("report", "Report: one file that opens anywhere", () => sender.send({report: true})),
  }
  const edit = tool("edit", "Edit name and note", editNames)

  const offer = () => {
    const {left} = model.header
    if (left && ask.kind === "") {
      ask.open("left", "status", node("p", {}, left),
        node("button", {type: "button", class: "main", onclick: () => sender.send({left: "take"})}, "Take it up again"),
        node("button", {type: "button", onclick: () => sender.send({left: "dismiss"})}, "Dismiss"))
    } else if (!left && ask.kind === "left") {
      ask.close()
    }
  }
  const show = () => {
    const head = model.header
    name.textContent = head.name
    name.title = head.name
    note.textContent = head.note || head.author
    note.title = head.note || head.author
    tools.undo.disabled = head.undo === ""
    tools.redo.disabled = head.redo === ""
    nameTool(tools.undo, head.undo || "Nothing to undo")
    nameTool(tools.redo, head.redo || "Nothing to do again")
    tools.save.hidden = head.file === ""
    tools.save.disabled = head.saved
    nameTool(tools.save, head.saved ? `${head.file} holds what is shown` : `Save to ${head.file}`)
    tools.report.disabled = head.busy !== ""
    mark.textContent = head.busy || (head.file !== "" && !head.saved ? "not saved" : "")
    done.textContent = head.said
    offer()
  }
  const address = () => {
    if (model.digest !== "") history.replaceState(null, "", `?state=${model.digest}`)
  }
  const away = () => {
    lost = true
    const said = node("span", {role: "status"})
    const again = () => fetch(location.href, {cache: "no-store"})
      .then(() => location.reload())
      .catch(() => { said.textContent = "It does not answer yet." })
    ask.open("lost", "alert",
      node("p", {}, "The connection to the program is lost. Changes made now are not kept; those before are: start Halfspan again and it offers them, or reload this page once it runs."),
      node("button", {type: "button", class: "main", onclick: again}, "Reload"), said)
  }

  window.addEventListener("keydown", (event) => {
    const key = event.key.toLowerCase()
    if (!(event.ctrlKey || event.metaKey) || event.altKey || typing()) return
    if (key !== "z" && key !== "y") return
    event.preventDefault()
    step(key === "y" || event.shiftKey ? 1 : -1)
  })
  window.addEventListener("halfspan-solving", (event) => {
    solving.textContent = {ready: "", solving: "solving", lost: "no answer yet"}[event.detail]
  })
  model.on("msg:custom", (message) => { if (message && message.download) handOver(message.download) })
  model.document?.on_event("connection_lost", away)
  model.on("header", show)
  model.on("digest", address)
  show()
  address()
  const title = node("header", {},
    node("div", {class: "top"}, node("p", {class: "mark"}, "Halfspan", solving),
      node("div", {class: "tools", role: "toolbar", "aria-label": "Scenario"}, ...Object.values(tools))),
    node("div", {class: "top"}, name, edit),
    node("div", {class: "top"}, note, mark))
  return {title, ask: ask.element, done}
}
