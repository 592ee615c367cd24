// A plain static server for dist/, on this machine only: www/start and the browser tests use it.
import { createReadStream, statSync } from "node:fs";
import { createServer } from "node:http";
import { extname, join, normalize, resolve, sep } from "node:path";
import { fileURLToPath } from "node:url";

const TYPES = {
  ".css": "text/css; charset=utf-8",
  ".csv": "text/csv; charset=utf-8",
  ".gz": "application/gzip",
  ".html": "text/html; charset=utf-8",
  ".js": "text/javascript; charset=utf-8",
  ".json": "application/json",
  ".svg": "image/svg+xml",
  ".txt": "text/plain; charset=utf-8",
  ".wasm": "application/wasm",
  ".woff2": "font/woff2",
};

/** The file that a request names, or null if it names none inside the folder. */
function fileOf(folder, url) {
  let path;
  try {
    path = normalize(decodeURIComponent(new URL(url, "http://localhost").pathname));
  } catch {
    return null;
  }
  const file = join(folder, path.endsWith("/") ? `${path}index.html` : path);
  if (!file.startsWith(folder + sep) || file.includes("\0")) return null;
  return statSync(file, { throwIfNoEntry: false })?.isFile() ? file : null;
}

/** Serves `folder` on 127.0.0.1; port 0 takes any free one. Resolves to the server once it listens. */
export function serve(folder, port = 0) {
  const home = resolve(folder);
  const server = createServer((request, response) => {
    if (request.method !== "GET" && request.method !== "HEAD") {
      response.writeHead(405).end();
      return;
    }
    const file = fileOf(home, request.url);
    if (!file) {
      response.writeHead(404, { "Content-Type": "text/plain" }).end("not found");
      return;
    }
    response.writeHead(200, {
      "Content-Type": TYPES[extname(file)] ?? "application/octet-stream",
      "Content-Length": statSync(file).size,
      "Cache-Control": "no-cache",
      "X-Content-Type-Options": "nosniff",
    });
    if (request.method === "HEAD") response.end();
    else createReadStream(file).on("error", () => response.destroy()).pipe(response);
  });
  return new Promise((done, failed) => {
    server.once("error", failed);
    server.listen(port, "127.0.0.1", () => done(server));
  });
}

/** Serves on the first free port from `first` on. */
async function serveFrom(folder, first, tries = 20) {
  for (let port = first; port < first + tries; port += 1) {
    try {
      return await serve(folder, port);
    } catch (error) {
      if (error.code !== "EADDRINUSE") throw error;
    }
  }
  throw new Error(`no free port from ${first} to ${first + tries - 1}: set PORT to another one`);
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const folder = process.argv[2] ?? "dist";
  const asked = process.env.PORT;
  try {
    const server = asked ? await serve(folder, Number(asked)) : await serveFrom(folder, 8017);
    const address = `http://127.0.0.1:${server.address().port}/`;
    console.log(`Millpond:                  ${address}\nwith a demo site opened:   ${address}#demo=hill-farm\nStop with Ctrl-C.`);
  } catch (error) {
    console.error(`\nStopped: ${error.message}.\nRemedy:  set PORT to a free port, e.g. PORT=9000 www/start.`);
    process.exit(1);
  }
}
