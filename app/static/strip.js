// Name, margins, and the reason in a sentence.

function bar(margin) {
  // The limit in the middle, what misses it to the left; far values are drawn in.
  const place = (share) => 50 + 46 * share / (0.35 + Math.abs(share))
  const parts = [
    drawn("path", {d: "M0 7 L5 2 M5 7 L10 2 M10 7 L15 2 M15 7 L20 2 M20 7 L25 2 M25 7 L30 2 M30 7 L35 2 M35 7 L40 2 M40 7 L45 2 M45 7 L50 2", class: "hatch"}),
    drawn("path", {d: "M50 4.5 L100 4.5", class: "free"}),
    drawn("path", {d: "M50 0 L50 9", class: "limit"}),
  ]
  if (margin.low !== null && margin.high !== null) {
    const ends = [place(margin.low), place(margin.high)].sort((a, b) => a - b)
    parts.push(drawn("rect", {
      x: ends[0], y: 2.5, width: Math.max(0.5, ends[1] - ends[0]), height: 4, class: "band",
    }))
  }
  if (margin.at !== null) {
    // A line without length and with round ends is a disc that does not stretch.
    parts.push(drawn("path", {d: `M${place(margin.at)} 4.5 l0.001 0`, class: "dot"}))
  }
  return drawn("svg", {
    viewBox: "0 0 100 9", class: "bar", "aria-hidden": "true", preserveAspectRatio: "none",
  }, ...parts)
}

function tile(margin, chosen, open) {
  return node("button", {
    class: `tile ${margin.verdict}`, type: "button", "data-key": margin.key,
    "aria-pressed": margin.key === chosen ? "true" : "false", "aria-label": margin.said,
    title: `${margin.said}. Opens its sheet and its reason.`,
    onclick: () => open(margin.key),
  },
    node("span", {class: "label"}, margin.label),
    node("span", {class: "value"}, margin.value, node("small", {}, ` ${margin.limit}`)),
    bar(margin),
    node("span", {class: "verdict"}, icon(margin.verdict), ` ${margin.verdict}`,
      node("small", {}, margin.margin)),
  )
}

export function render({model}) {
  const sender = new Sender(model)
  const header = makeHeader(model)
  const tiles = node("div", {class: "tiles", role: "group", "aria-label": "Margins"})
  const reason = node("p", {class: "reason"})
  const notice = node("p", {class: "notice", role: "alert"})
  const open = (key) => sender.send({open: key})

  const fillTiles = once((data) => {
    const focused = tiles.getRootNode().activeElement
    const key = focused && focused.dataset ? focused.dataset.key : undefined
    tiles.replaceChildren(...data.margins.map((margin) => tile(margin, data.chosen, open)))
    if (key) {
      const again = [...tiles.children].find((one) => one.dataset.key === key)
      if (again) again.focus()
    }
  })
  const fillReason = once((data) => {
    const title = node("strong", {}, data.reason_title)
    reason.replaceChildren(...(data.reason_title ? [title, " "] : []), data.reason)
    if (data.chosen) {
      reason.append(" ", node("button", {
        type: "button", class: "plain", onclick: () => sender.send({open: ""}),
      }, "Back to the main reason"))
    }
  })
  const show = () => {
    const data = model.data
    fillTiles({margins: data.margins, chosen: data.chosen})
    fillReason({reason: data.reason, reason_title: data.reason_title, chosen: data.chosen})
    notice.textContent = data.notice
    notice.hidden = data.notice === ""
  }
  model.on("data", show)
  show()
  return node("div", {class: "head"},
    header.title,
    tiles,
    header.ask,
    node("div", {class: "said"}, reason, notice, header.done))
}
