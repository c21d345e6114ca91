// The shipped module's kernels by themselves, in the browser that the page runs in: bundled by page.mjs, called as `kernels`.
import init, { benchmarkEigen, benchmarkGram } from "teasel-module";

/** @param {() => unknown} act @param {number} count */
function shortest(act, count) {
  let best = Infinity;
  for (let i = 0; i < count; i += 1) {
    const from = performance.now();
    act();
    best = Math.min(best, performance.now() - from);
  }
  return best;
}

/** @type {any} */ (globalThis).kernels = async (/** @type {Uint8Array<ArrayBuffer>} */ bytes) => {
  await init({ module_or_path: bytes });
  return {
    eigen_512_ms: shortest(() => benchmarkEigen(512), 3),
    // 64 channels, 1600 windows of 512 samples: n·(n+1)·k operations each, as only one half is computed.
    gram_gflops: (64 * 65 * 512 * 1600) / shortest(() => benchmarkGram(64, 512, 1600), 3) / 1e6,
  };
};
