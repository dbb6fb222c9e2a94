// Inputs: a slider with a typed entry beside it, unit, help and refusal.

const TIDY = (value) => Number(value.toPrecision(9))

// A slider over the whole of a wide range could not be set finely: it spans a
// window around the value, and moves on when the value reaches its end.
function windowed(field, value) {
  const {low, high, step} = field
  if ((high - low) / step <= 420) return [low, high]
  const reach = Math.max(0.6 * Math.abs(value), 60 * step)
  const first = Math.max(low, low + Math.floor((value - reach - low) / step) * step)
  const last = Math.min(high, low + Math.ceil((value + reach - low) / step) * step)
  return [TIDY(first), TIDY(last)]
}

function parsed(text) {
  const plain = text.trim().replace(/[\u2212\u2013]/g, "-").replace(/[\s\u00a0\u202f]/g, "").replace(",", ".")
  return /^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i.test(plain) ? Number(plain) : null
}

class Entry {
  constructor(field, column) {
    this.field = field
    this.column = column
    const id = `field-${field.name}`
    const described = `${id}-help ${id}-error`
    this.error = node("p", {class: "refusal", id: `${id}-error`, role: "alert", hidden: true})
    this.input = this.makeInput(id, described)
    this.slider = field.kind === "number" ? this.makeSlider(described) : null
    this.element = node("div", {
      class: `field ${field.kind}`, "data-name": field.name,
      onfocusin: () => column.help(field), onpointerenter: () => column.help(field),
    },
      node("label", {for: id}, field.label),
      node("span", {class: "entry"}, this.input, node("span", {class: "unit"}, field.unit)),
      this.slider,
      node("span", {class: "unseen", id: `${id}-help`}, `${field.help} Allowed: ${field.allowed}.`),
      this.error,
    )
  }

  makeInput(id, described) {
    const field = this.field
    const common = {id, "aria-describedby": described, "data-name": field.name}
    if (field.kind === "choice") {
      const options = field.choices.map((choice) => node("option", {value: choice}, choice))
      return node("select", {...common, onchange: () => this.send(this.input.value)}, ...options)
    }
    const input = node("input", {
      ...common, type: "text", autocomplete: "off", spellcheck: "false",
      inputmode: field.kind === "number" ? "decimal" : "text",
      onchange: () => this.typed(),
      onkeydown: (event) => { if (event.key === "Enter") this.typed() },
    })
    if (field.kind === "section") {
      const list = node("datalist", {id: `${id}-list`},
        ...field.choices.map((choice) => node("option", {value: choice})))
      input.setAttribute("list", `${id}-list`)
      this.list = list
    }
    return input
  }

  makeSlider(described) {
    return node("input", {
      type: "range", "aria-label": this.field.label, "aria-describedby": described,
      "data-name": this.field.name,
      oninput: () => this.slid(),
      onchange: () => this.place(Number(this.slider.value)),
    })
  }

  slid() {
    const value = TIDY(Number(this.slider.value))
    this.input.value = String(value)
    this.say(value)
    this.send(value)
  }

  typed() {
    const text = this.input.value
    if (text === this.sent) return
    this.sent = text
    if (this.field.kind === "section") { this.send(text); return }
    const value = parsed(text)
    if (value === null) {
      this.refuse(`${this.field.label} must be ${this.field.allowed}; got \u201c${text.slice(0, 40)}\u201d.`)
    } else {
      this.send(value)
    }
  }

  send(value) { this.column.sender.set({[this.field.name]: value}) }

  refuse(text) {
    const wrong = text !== ""
    if (this.error.textContent !== text) this.error.textContent = text
    this.error.hidden = !wrong
    this.element.classList.toggle("wrong", wrong)
    if (wrong) this.input.setAttribute("aria-invalid", "true")
    else this.input.removeAttribute("aria-invalid")
  }

  say(value) {
    const unit = this.field.unit
    if (this.slider) this.slider.setAttribute("aria-valuetext", unit ? `${value} ${unit}` : `${value}`)
  }

  place(value) {
    if (!this.slider) return
    const inside = value > Number(this.slider.min) && value < Number(this.slider.max)
    if (!inside || this.slider.min === "") {
      const [first, last] = windowed(this.field, value)
      Object.assign(this.slider, {step: this.field.step, min: first, max: last})
    }
    this.slider.value = value
    this.say(value)
  }

  // The page's state is shown; what was refused stays where it was typed.
  show(value, refusal) {
    if (refusal) {
      if (this.sent === undefined) {
        // Drawn anew beside another sheet: the refused value comes back too.
        this.input.value = String(refusal.value)
        this.sent = this.input.value
        if (typeof value === "number") this.place(value)
      }
      this.refuse(refusal.text)
      return
    }
    const editing = this.element.getRootNode().activeElement === this.input
    const unsent = editing && this.input.value !== this.sent && this.field.kind !== "choice"
    if (unsent && this.sent !== undefined) return
    this.refuse("")
    const text = typeof value === "number" ? String(TIDY(value)) : value
    this.input.value = text
    this.sent = text
    if (typeof value === "number") this.place(value)
  }
}

export function render({model}) {
  const open = {}
  const helpName = node("strong", {})
  const helpText = node("span", {})
  const column = {
    sender: new Sender(model, () => show()),
    help: (field) => {
      helpName.textContent = field.label
      helpText.textContent = ` ${field.help} Allowed: ${field.allowed}.`
    },
  }
  const body = node("div", {class: "groups"})
  let entries = []

  const build = () => {
    entries = []
    const parts = model.groups.map((group) => {
      const key = group.title
      const made = group.fields.map((field) => new Entry(field, column))
      entries.push(...made)
      const first = key in open ? open[key] : group.open
      return node("details", {
        open: first, ontoggle: (event) => { open[key] = event.target.open },
      },
        node("summary", {}, group.title),
        ...made.map((entry) => entry.element),
        ...made.filter((entry) => entry.list).map((entry) => entry.list))
    })
    body.replaceChildren(...parts)
    body.scrollTop = 0
    show()
  }
  const show = () => {
    if (!column.sender.idle) return
    const {values, refusals} = model.state
    for (const entry of entries) entry.show(values[entry.field.name], refusals[entry.field.name])
  }
  model.on("groups", build)
  model.on("state", show)
  build()
  helpText.textContent = "Point at a field to read what it means and what it allows."
  return node("div", {class: "inputs"}, body, node("p", {class: "help"}, helpName, helpText))
}
