/** Building the page from text nodes, and a little about time. */

/** @typedef {Node | string | null | false | undefined} Child */

/**
 * An HTML element. Strings become text nodes, so nothing that comes from a file can turn into markup.
 * @template {keyof HTMLElementTagNameMap} K
 * @param {K} tag
 * @param {Record<string, string | number | boolean | null | undefined | ((event: any) => void)>} [attributes] functions listen to the event of that name
 * @param {...Child} children
 * @returns {HTMLElementTagNameMap[K]}
 */
export function make(tag, attributes = {}, ...children) {
  const node = document.createElement(tag);
  dress(node, attributes);
  node.append(...children.filter(present));
  return node;
}

/**
 * An SVG element.
 * @template {keyof SVGElementTagNameMap} K
 * @param {K} tag
 * @param {Record<string, string | number | boolean | null | undefined>} [attributes]
 * @param {...Child} children
 * @returns {SVGElementTagNameMap[K]}
 */
export function makeSvg(tag, attributes = {}, ...children) {
  const node = document.createElementNS("http://www.w3.org/2000/svg", tag);
  dress(node, attributes);
  node.append(...children.filter(present));
  return node;
}

/** @param {Child} child @returns {child is Node | string} */
function present(child) {
  return child !== null && child !== false && child !== undefined;
}

/**
 * @param {Element} node
 * @param {Record<string, unknown>} attributes
 */
function dress(node, attributes) {
  for (const [name, value] of Object.entries(attributes)) {
    if (typeof value === "function") node.addEventListener(name, /** @type {EventListener} */ (value));
    else if (value === true) node.setAttribute(name, "");
    else if (value !== false && value !== null && value !== undefined) node.setAttribute(name, String(value));
  }
}

/**
 * The one element that a selector names in the page's own markup.
 * @template {Element} [T=HTMLElement]
 * @param {string} selector
 * @param {ParentNode} [within]
 * @returns {T}
 */
export function find(selector, within = document) {
  const found = within.querySelector(selector);
  if (!found) throw new Error(`the page lacks ${selector}`);
  return /** @type {T} */ (found);
}

/**
 * Runs `work` once at the next frame, however often it is asked for.
 * @param {() => void} work
 */
export function eachFrame(work) {
  let waiting = false;
  return () => {
    if (waiting) return;
    waiting = true;
    requestAnimationFrame(() => {
      waiting = false;
      work();
    });
  };
}

/**
 * Runs `work` after a rest.
 * @param {() => void} work
 * @param {number} ms
 */
export function afterRest(work, ms) {
  /** @type {ReturnType<typeof setTimeout> | undefined} */
  let timer;
  return () => {
    clearTimeout(timer);
    timer = setTimeout(work, ms);
  };
}

/**
 * Hands bytes to the browser's download.
 * @param {string} name
 * @param {BlobPart} bytes
 * @param {string} type
 */
export function download(name, bytes, type) {
  const address = URL.createObjectURL(new Blob([bytes], { type }));
  const link = make("a", { href: address, download: name });
  document.body.append(link);
  link.click();
  link.remove();
  setTimeout(() => URL.revokeObjectURL(address), 10_000);
}
