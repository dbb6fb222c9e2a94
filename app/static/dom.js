// Shared by all components of the page. Text is only ever set as text.

const SVG = "http://www.w3.org/2000/svg"

function fill(element, attributes, children) {
  for (const [name, value] of Object.entries(attributes)) {
    if (value === false || value === null || value === undefined) continue
    if (name.startsWith("on")) element.addEventListener(name.slice(2), value)
    else element.setAttribute(name, value === true ? "" : String(value))
  }
  element.append(...children.filter((child) => child !== null))
  return element
}

function node(tag, attributes = {}, ...children) {
  return fill(document.createElement(tag), attributes, children)
}

function drawn(tag, attributes = {}, ...children) {
  return fill(document.createElementNS(SVG, tag), attributes, children)
}

const ICONS = {
  pass: ["M3.5 8.5 L6.8 11.8 L12.5 4.8"],
  watch: ["M8 2.2 L14.4 13.6 L1.6 13.6 Z", "M8 6.4 L8 9.8", "M8 11.6 L8 12"],
  fail: ["M5.2 1.8 L10.8 1.8 L14.2 5.2 L14.2 10.8 L10.8 14.2 L5.2 14.2 L1.8 10.8 L1.8 5.2 Z",
    "M5.5 5.5 L10.5 10.5", "M10.5 5.5 L5.5 10.5"],
  undo: ["M5.5 2.5 L2.5 5.5 L5.5 8.5", "M2.5 5.5 L9.5 5.5 A4 4 0 0 1 9.5 13.5 L6 13.5"],
  redo: ["M10.5 2.5 L13.5 5.5 L10.5 8.5", "M13.5 5.5 L6.5 5.5 A4 4 0 0 0 6.5 13.5 L10 13.5"],
  edit: ["M2.5 13.5 L3.2 10.4 L11 2.6 L13.4 5 L5.6 12.8 Z"],
  snapshot: ["M1.8 5 L4.8 5 L6 3 L10 3 L11.2 5 L14.2 5 L14.2 13 L1.8 13 Z",
    "M8 6.3 A2.4 2.4 0 1 0 8.01 6.3 Z"],
  save: ["M2.5 2.5 L11.3 2.5 L13.5 4.7 L13.5 13.5 L2.5 13.5 Z", "M5 2.5 L5 6 L10 6 L10 2.5",
    "M4.8 13.5 L4.8 9.3 L11.2 9.3 L11.2 13.5"],
  down: ["M8 2.5 L8 10", "M4.8 7 L8 10.2 L11.2 7", "M2.5 13.5 L13.5 13.5"],
  up: ["M8 10.5 L8 3", "M4.8 6 L8 2.8 L11.2 6", "M2.5 13.5 L13.5 13.5"],
  report: ["M3.5 1.8 L9.5 1.8 L12.5 4.8 L12.5 14.2 L3.5 14.2 Z", "M9.3 2 L9.3 5 L12.3 5",
    "M5.5 11.5 L7.3 8.5 L8.8 10.2 L10.5 7.4"],
  restore: ["M2.8 8 A5.2 5.2 0 1 0 4.6 4.1", "M2.6 2.4 L4.4 4.4 L6.8 3.2", "M8 5 L8 8.3 L10.3 9.6"],
  remove: ["M3 4.5 L13 4.5", "M6 4.3 L6 2.5 L10 2.5 L10 4.3", "M4.2 4.6 L4.9 13.5 L11.1 13.5 L11.8 4.6"],
}

function icon(name) {
  const paths = ICONS[name].map((d) => drawn("path", {
    d, fill: "none", stroke: "currentColor", "stroke-width": 1.7,
    "stroke-linecap": "round", "stroke-linejoin": "round",
  }))
  return drawn("svg", {viewBox: "0 0 16 16", width: 14, height: 14, "aria-hidden": "true"}, ...paths)
}

// Counts the messages of all senders, so that no answer is taken for another's.
let messages = 0

const QUIET = 25, BUSY_AFTER = 150, LOST_AFTER = 10000

function tell(state) {
  document.documentElement.style.setProperty("--plots", state === "ready" ? "1" : "0.35")
  window.dispatchEvent(new CustomEvent("halfspan-solving", {detail: state}))
}

// At most one message in flight; of what waits, the newest value of each field wins.
class Sender {
  constructor(model, landed = (answer) => {}) {
    this.model = model
    this.landed = landed
    this.flying = 0
    this.last = 0
    this.timer = 0
    this.waiting = null
    model.on("msg:custom", (message) => this.answer(message))
  }

  get idle() { return this.flying === 0 && this.waiting === null }

  set(values) {
    const before = this.waiting !== null && this.waiting.values ? this.waiting.values : {}
    this.send({values: {...before, ...values}})
  }

  send(message) {
    this.waiting = message
    this.pump()
  }

  pump() {
    if (this.flying !== 0 || this.waiting === null || this.timer !== 0) return
    const rest = this.last + QUIET - performance.now()
    if (rest > 0) {
      this.timer = setTimeout(() => { this.timer = 0; this.pump() }, rest)
      return
    }
    const message = this.waiting
    this.waiting = null
    this.flying = ++messages
    window.halfspanFlying = (window.halfspanFlying ?? 0) + 1
    this.last = performance.now()
    this.busy = setTimeout(() => tell("solving"), BUSY_AFTER)
    this.lost = setTimeout(() => tell("lost"), LOST_AFTER)
    this.model.send_msg({...message, seq: this.flying})
  }

  answer(message) {
    if (!message || message.done !== this.flying) return
    clearTimeout(this.busy)
    clearTimeout(this.lost)
    this.flying = 0
    window.halfspanFlying -= 1
    tell("ready")
    if (message.answer && message.answer.download) handOver(message.answer.download)
    this.landed(message.answer ?? null)
    this.pump()
  }
}

// Gives the user a file that came as letters in an answer.
function handOver({name, data}) {
  const bytes = Uint8Array.from(atob(data), (letter) => letter.charCodeAt(0))
  const url = URL.createObjectURL(new Blob([bytes], {type: "application/octet-stream"}))
  const link = node("a", {href: url, download: name, hidden: true})
  document.body.append(link)
  link.click()
  link.remove()
  setTimeout(() => URL.revokeObjectURL(url), 60000)
}

function tool(name, label, onclick, attributes = {}) {
  return node("button", {
    type: "button", class: "tool", title: label, "aria-label": label, onclick, ...attributes,
  }, icon(name))
}

function nameTool(button, label) {
  button.title = label
  button.setAttribute("aria-label", label)
}

// The element with the focus, however deep, and whether letters go into it.
function focused() {
  let one = document.activeElement
  while (one && one.shadowRoot && one.shadowRoot.activeElement) one = one.shadowRoot.activeElement
  return one
}

function typing() {
  const one = focused()
  if (!one) return false
  const quiet = ["range", "checkbox", "radio", "button", "submit", "file"]
  return one.tagName === "TEXTAREA" || one.isContentEditable
    || (one.tagName === "INPUT" && !quiet.includes(one.type))
}

// Calls `make` only when its data changed: what stays the same is not built again.
function once(make) {
  let before
  return (data) => {
    const now = JSON.stringify(data)
    if (now === before) return
    before = now
    make(data)
  }
}
