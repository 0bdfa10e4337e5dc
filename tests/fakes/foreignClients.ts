import { type ChildProcess, spawn } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';

export const KEYS = { access: 'FOREIGNCLIENT', secret: 'foreign/secret+with=signs' };
export const BUCKET = 'foreign-clients';

export interface Ran {
  code: number | null;
  out: string;
  err: string;
}

/** The fake as its npm command starts it, and a home directory in which other makers' clients find their settings. */
export interface Foreign {
  url: string;
  home: string;
  /** Run a program of /usr/bin with this home. */
  run(program: string, args: readonly string[], input?: string): Promise<Ran>;
  /** As `run`, and throws where it did not end with 0. @returns its standard output */
  ok(program: string, args: readonly string[], input?: string): Promise<string>;
  stop(): Promise<number | null>;
}

export async function startForeign(): Promise<Foreign> {
  const home = mkdtempSync(join(tmpdir(), 'bellkeep-foreign-'));
  const args = [
    '--port',
    '0',
    '--dir',
    join(home, 'store'),
    '--access-key',
    KEYS.access,
    '--secret-key',
    KEYS.secret,
    '--bucket',
    BUCKET,
  ];
  const server = spawn('npm', ['run', 'storage-fake', '--', ...args], {
    stdio: ['ignore', 'pipe', 'inherit'],
  });
  const ended = new Promise<number | null>((resolve) => server.once('exit', resolve));
  const url = await listening(server);
  writeSettings(home, url);
  // Nothing of this machine's own settings: its proxies, certificates and keys are not the fake's.
  const env: NodeJS.ProcessEnv = {
    NODE_ENV: 'test',
    PATH: '/usr/bin:/bin',
    HOME: home,
    LANG: 'C.UTF-8',
    AWS_ACCESS_KEY_ID: KEYS.access,
    AWS_SECRET_ACCESS_KEY: KEYS.secret,
    AWS_DEFAULT_REGION: 'us-east-1',
    AWS_PAGER: '',
    RCLONE_CONFIG: join(home, 'rclone.conf'),
    STORE_URL: url,
    STORE_BUCKET: BUCKET,
  };
  const run: Foreign['run'] = (program, argv, input = '') =>
    new Promise((resolve, reject) => {
      const child = spawn(`/usr/bin/${program}`, argv, { cwd: home, env });
      let [out, err] = ['', ''];
      child.stdout.setEncoding('utf8').on('data', (text: string) => {
        out += text;
      });
      child.stderr.setEncoding('utf8').on('data', (text: string) => {
        err += text;
      });
      child.once('error', reject).once('close', (code) => resolve({ code, out, err }));
      child.stdin.on('error', () => undefined).end(input);
    });
  return {
    url,
    home,
    run,
    async ok(program, argv, input) {
      const ran = await run(program, argv, input);
      if (ran.code !== 0)
        throw new Error(`${program} ${argv.join(' ')} ended with ${ran.code}:\n${ran.out}\n${ran.err}`);
      return ran.out;
    },
    async stop() {
      server.kill('SIGTERM');
      const code = await ended;
      rmSync(home, { recursive: true, force: true });
      return code;
    },
  };
}

function listening(server: ChildProcess): Promise<string> {
  return new Promise((resolve, reject) => {
    let text = '';
    server.once('error', reject).once('exit', () => reject(new Error(`the fake ended: ${text}`)));
    server.stdout?.setEncoding('utf8').on('data', (piece: string) => {
      text += piece;
      const line = /^storage fake listening on (http:\S+)$/m.exec(text);
      if (line !== null) resolve(line[1] as string);
    });
  });
}

function writeSettings(home: string, url: string): void {
  const host = new URL(url).host;
  const common = `type = s3\naccess_key_id = ${KEYS.access}\nsecret_access_key = ${KEYS.secret}\nendpoint = ${url}\n`;
  writeFileSync(join(home, 'rclone.conf'), `[other]\nprovider = Other\n${common}\n[plain]\n${common}`);
  writeFileSync(
    join(home, '.s3cfg'),
    `[default]\naccess_key = ${KEYS.access}\nsecret_key = ${KEYS.secret}\nhost_base = ${host}\nhost_bucket = ${host}\nuse_https = False\n`,
  );
}
