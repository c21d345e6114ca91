import init, { version } from "teasel-module";

/** @param {string} id */
const block = (id) => {
  const text = document.getElementById(id)?.textContent;
  if (!text) throw new Error(`the page lacks its part ${id}`);
  return text;
};

async function compile() {
  const packed = Uint8Array.from(atob(block("teasel-module")), (c) => c.charCodeAt(0));
  const stream = new Blob([packed]).stream().pipeThrough(new DecompressionStream("gzip"));
  return WebAssembly.compile(await new Response(stream).arrayBuffer());
}

export async function start() {
  const module = await compile();
  await init({ module_or_path: module });
  const url = URL.createObjectURL(new Blob([block("teasel-worker")], { type: "text/javascript" }));
  const worker = new Worker(url);
  await new Promise((resolve, reject) => {
    worker.onmessage = resolve;
    worker.onerror = reject;
    worker.postMessage({ module });
  });
  return { version: version() };
}
