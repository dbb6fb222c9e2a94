// What to be careful about, always in view.

export function render({model}) {
  const root = node("footer", {class: "cautions"})
  const show = () => root.replaceChildren(...model.sentences.map((text) => node("span", {}, text)))
  model.on("sentences", show)
  show()
  return root
}
