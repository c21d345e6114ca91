import init, { version } from "teasel-module";

onmessage = async ({ data }) => {
  await init({ module_or_path: data.module });
  postMessage({ event: "started", version: version() });
};
