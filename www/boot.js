// Starts the page, and workers with the engine when the page asks for them. The engine's wasm is fetched and compiled once, at the
// first sign that somebody is about to use it; every worker runs from that one compiled module. When the engine meets a workbook it
// asks for its sheets, and gets them from a third program, whose worker is made for that workbook and ended after it.
//
// What the page (src/main.rs, src/bridge) uses, as properties of globalThis.millpond:
//   spawn()          a new Worker with the engine on its way
//   notice(text)     shows that something is broken, by plain DOM, since the page's own code may be what broke
//
// The build writes the hashed names of the six files into this script's own element (www/after-build.mjs).
"use strict";
(() => {
  const { glue, wasm, engineGlue, engineWasm, workbooksGlue, workbooksWasm } = document.currentScript.dataset;
  globalThis.millpond = { spawn, notice };

  // The worker is a classic one made from a Blob, because that also starts in a file opened from disk. Its first message
  // brings the module; the start is synchronous, so a message that follows at once finds the listener that main() has set.
  const START = `
;self.addEventListener("message", (event) => { wasm_bindgen.initSync({ module: event.data.module }); }, { once: true });`;

  let noticed = false;

  /** Shows one notice above everything else; the first one stands, since what follows is its consequence. */
  function notice(text) {
    if (noticed) return;
    noticed = true;
    const box = document.createElement("div");
    box.className = "error notice";
    box.setAttribute("role", "alert");
    const [what, ...rest] = text.split("\n");
    box.append(Object.assign(document.createElement("b"), { textContent: what }));
    for (const line of rest) box.append(Object.assign(document.createElement("span"), { textContent: line }));
    const again = Object.assign(document.createElement("button"), { textContent: "Reload the page" });
    again.addEventListener("click", () => location.reload());
    box.append(again);
    document.body.prepend(box);
    document.documentElement.dataset.settled = "true";
  }

  function stopped(error) {
    const kept = document.documentElement.dataset.kept === "true" ? "Your case is kept. " : "";
    notice(`Millpond stopped: ${error?.message ?? error}\n${kept}Reload the page to go on. No file has left this computer.`);
  }

  // An event without an error is the browser's own remark (such as a resize observer's), not a failure of the page.
  addEventListener("error", (event) => event.error && stopped(event.error));
  addEventListener("unhandledrejection", (event) => stopped(event.reason));

  async function get(name) {
    const answer = await fetch(name);
    if (!answer.ok) throw new Error(`${name} was not found (${answer.status})`);
    return answer;
  }

  async function compile(name) {
    const answer = await get(name);
    if (answer.headers.get("Content-Type")?.startsWith("application/wasm")) return WebAssembly.compileStreaming(answer);
    return WebAssembly.compile(await answer.arrayBuffer());
  }

  /** The glue as a script of the page: defines the global wasm_bindgen. */
  function runGlue() {
    return new Promise((done, failed) => {
      const script = Object.assign(document.createElement("script"), { src: glue, onload: done });
      script.onerror = () => failed(new Error(`${glue} was not found`));
      document.head.append(script);
    });
  }

  const programs = {};

  /** A program for workers, fetched once: the worker's script as an address, and the compiled module. */
  function program(glue, wasm) {
    programs[wasm] ??= Promise.all([get(glue).then((answer) => answer.text()), compile(wasm)])
      .then(([text, module]) => ({ module, script: URL.createObjectURL(new Blob([text, START], { type: "text/javascript" })) }));
    // A failure is not kept, so that the next try may succeed.
    programs[wasm].catch(() => { delete programs[wasm]; });
    return programs[wasm];
  }

  const fetchEngine = () => program(engineGlue, engineWasm);

  /** The sheets of a workbook as text tables, or what is wrong and the remedy: an answer to the engine's question of this number. */
  async function sheets({ id, workbook }) {
    const remedy = "Choose the file again, or save the sheet with the readings as CSV and choose that file.";
    let reader;
    try {
      reader = started(await program(workbooksGlue, workbooksWasm));
    } catch (error) {
      return { id, what: `the reader of workbooks could not be loaded: ${error?.message ?? error}`, remedy };
    }
    const answer = await new Promise((done) => {
      reader.addEventListener("message", (event) => done(event.data));
      reader.addEventListener("error", (event) => {
        event.preventDefault();
        done({ what: `the reader of workbooks stopped: ${event.message ?? "no reason given"}`, remedy });
      });
      reader.postMessage({ workbook }, [workbook.buffer]);
    });
    reader.terminate();
    return { id, ...answer };
  }

  function started({ module, script }) {
    const worker = new Worker(script);
    // What it says before anyone listens (its first sign of life) is kept for whoever takes it.
    const said = [];
    const hold = (event) => said.push(event.data);
    worker.addEventListener("message", hold);
    worker.said = () => { worker.removeEventListener("message", hold); return said; };
    worker.postMessage({ module });
    return worker;
  }

  let spare = null;

  /** Has the engine fetched and a worker running before the first file comes. */
  function prepare() {
    fetchEngine().then((engine) => { if (!spawned) spare ??= started(engine); }, () => {});
  }

  let spawned = false;

  /** A worker with the engine. What is posted to it before the engine is there is held back. */
  function spawn() {
    spawned = true;
    const early = [];
    let worker = null;
    let ended = false;
    // The page listens and posts to this stand-in as it would to the worker itself.
    const port = new EventTarget();
    port.postMessage = (data) => (worker ? worker.postMessage(data) : early.push(data));
    port.terminate = () => { ended = true; worker?.terminate(); };
    fetchEngine().then((engine) => {
      if (ended) return;
      worker = spare ?? started(engine);
      spare = null;
      for (const name of ["message", "messageerror"]) {
        worker.addEventListener(name, (event) => {
          if (event.data?.workbook) return sheets(event.data).then((answer) => worker.postMessage(answer));
          port.dispatchEvent(new MessageEvent(name, { data: event.data }));
        });
      }
      worker.addEventListener("error", (event) => { event.preventDefault(); port.dispatchEvent(new Event("error")); });
      for (const data of worker.said()) port.dispatchEvent(new MessageEvent("message", { data }));
      for (const data of early) worker.postMessage(data);
    }, (error) => {
      notice(`The engine could not be loaded: ${error?.message ?? error}\nCheck the connection and reload the page.`);
    });
    return port;
  }

  /** Fetches the engine at the first sign of use, so that it is there when the first file comes. */
  function fetchEngineEarly() {
    for (const name of ["pointerover", "dragenter", "focusin", "keydown", "touchstart"]) {
      addEventListener(name, prepare, { once: true, passive: true });
    }
    // Whoever reads the page first finds it there as well; not at once, so that the page itself is never kept waiting.
    setTimeout(prepare, 1500);
  }

  /** Only once the page runs, so that the first download is not slowed. Browsers allow it on https and on this machine. */
  function keepForOffline() {
    // Without it the page works all the same, only not without a network.
    if (isSecureContext) navigator.serviceWorker?.register("offline.js").catch(() => {});
  }

  async function start() {
    if (typeof WebAssembly !== "object") {
      return notice("This browser has no WebAssembly.\nOpen the page in a browser of the last few years, or allow WebAssembly in its settings.");
    }
    if (location.protocol === "file:") {
      return notice("This page cannot start from a folder on disk.\nServe the folder (www/start does), or use the one-file build.");
    }
    try {
      const [module] = await Promise.all([compile(wasm), runGlue()]);
      await wasm_bindgen({ module_or_path: module });
      fetchEngineEarly();
      keepForOffline();
    } catch (error) {
      if (error instanceof WebAssembly.RuntimeError) return stopped(error);
      notice(`Millpond could not be loaded: ${error?.message ?? error}\nCheck the connection and reload the page.`);
    }
  }

  start();
})();
