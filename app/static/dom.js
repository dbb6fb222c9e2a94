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
  constructor(model, landed = () => {}) {
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
    this.landed()
    this.pump()
  }
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
