type Child = Node | string

/** An HTML element with attributes and children. Texts become text nodes, never markup. */
export function el<K extends keyof HTMLElementTagNameMap>(
  tag: K,
  attributes: Readonly<Record<string, string>> = {},
  ...children: Child[]
): HTMLElementTagNameMap[K] {
  const node = document.createElement(tag)
  for (const [name, value] of Object.entries(attributes)) node.setAttribute(name, value)
  node.append(...children)
  return node
}

/** An SVG element. */
export function svg<K extends keyof SVGElementTagNameMap>(
  tag: K,
  attributes: Readonly<Record<string, string>> = {},
  ...children: Node[]
): SVGElementTagNameMap[K] {
  const node = document.createElementNS('http://www.w3.org/2000/svg', tag)
  set(node, attributes)
  node.append(...children)
  return node
}

export function set(node: Element, attributes: Readonly<Record<string, string>>): void {
  for (const [name, value] of Object.entries(attributes))
    if (node.getAttribute(name) !== value) node.setAttribute(name, value)
}

/** Writes only what has changed, so that a selection and a screen reader are left in peace. */
export function say(node: Element, text: string): void {
  if (node.textContent !== text) node.textContent = text
}

/** Keeps the children of `parent` in line with `items`: nodes are made, brought up to date, moved and removed by key. */
export class KeyedList<T, N extends Element> {
  readonly #parent: Element
  readonly #make: (item: T) => { readonly node: N; update(item: T): void }
  readonly #key: (item: T) => string
  #shown = new Map<string, { readonly node: N; update(item: T): void }>()

  constructor(
    parent: Element,
    key: (item: T) => string,
    make: (item: T) => { readonly node: N; update(item: T): void },
  ) {
    this.#parent = parent
    this.#key = key
    this.#make = make
  }

  update(items: readonly T[]): void {
    const next = new Map<string, { readonly node: N; update(item: T): void }>()
    for (const item of items) {
      const key = this.#key(item)
      const part = this.#shown.get(key) ?? this.#make(item)
      part.update(item)
      next.set(key, part)
    }
    for (const [key, { node }] of this.#shown) if (!next.has(key)) node.remove()
    let place = this.#parent.firstElementChild
    for (const { node } of next.values()) {
      if (node === place) place = place.nextElementSibling
      else this.#parent.insertBefore(node, place)
    }
    this.#shown = next
  }
}
