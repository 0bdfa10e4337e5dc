import { spawn } from 'node:child_process';
import { createServer } from 'node:net';

/** The storage client says at every start that it will want a newer Node next year; DEVELOPERS.md says it once. */
export const QUIET = { AWS_SDK_JS_NODE_VERSION_SUPPORT_WARNING_DISABLED: 'true' };

/** A port that is free now, `preferred` if it is. */
export function freePort(preferred = 0) {
  return new Promise((resolve, reject) => {
    const server = createServer();
    server.once('error', () => (preferred === 0 ? reject(new Error('no free port')) : resolve(freePort())));
    server.listen(preferred, '127.0.0.1', () => {
      const { port } = server.address();
      server.close(() => resolve(port));
    });
  });
}

/** Child processes that end with this one, last started first. */
export class Household {
  #children = [];

  /** @param {string[]} args arguments of node  @param {{ env?: object, onLine?: (line: string) => void, log?: number }} options */
  start(name, args, options = {}) {
    const child = spawn(process.execPath, args, {
      stdio: ['ignore', options.log ?? 'pipe', options.log ?? 'pipe'],
      env: { ...process.env, NEXT_TELEMETRY_DISABLED: '1', ...QUIET, ...options.env },
    });
    const entry = { name, child, said: '', ended: null };
    entry.ended = new Promise((resolve) => child.once('exit', (code, signal) => resolve({ code, signal })));
    for (const stream of [child.stdout, child.stderr]) {
      stream?.on('data', (text) => {
        entry.said = (entry.said + text).slice(-20_000);
        if (options.onLine) for (const line of String(text).split('\n')) if (line) options.onLine(line);
      });
    }
    this.#children.push(entry);
    return entry;
  }

  async stop() {
    for (const { child, ended } of this.#children.reverse()) {
      if (child.exitCode !== null || child.signalCode !== null) continue;
      child.kill('SIGTERM');
      const timer = setTimeout(() => child.kill('SIGKILL'), 5_000);
      await ended;
      clearTimeout(timer);
    }
    this.#children = [];
  }
}

/** Wait until an address answers, whatever it says, but with a fault of its own. @throws Error when the process ended or the time is over */
export async function untilAnswers(url, entry, milliseconds = 60_000) {
  const until = Date.now() + milliseconds;
  let ended = null;
  entry.ended.then((how) => {
    ended = how;
  });
  for (;;) {
    if (ended) throw new Error(`${entry.name} ended at once:\n${entry.said}`);
    try {
      if ((await fetch(url)).status < 500) return;
    } catch {
      // Not up yet.
    }
    if (Date.now() > until) throw new Error(`${entry.name} did not answer at ${url}:\n${entry.said}`);
    await new Promise((resolve) => setTimeout(resolve, 100));
  }
}
