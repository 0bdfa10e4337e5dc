import { execFileSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { createServer, type Server } from 'node:https';
import type { AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { callOutside, type Resolved } from '@/lib/platform/outside';

const LOOPBACK = { PRIVATE_ADDRESSES_ALLOWED: ['127.0.0.0/8'] };
const here = async (): Promise<Resolved[]> => [{ address: '127.0.0.1', family: 4 }];
let server: Server;
let folder: string;

beforeAll(async () => {
  folder = mkdtempSync(join(tmpdir(), 'bellkeep-tls-'));
  execFileSync(
    'openssl',
    [
      ...'req -x509 -newkey ec -pkeyopt ec_paramgen_curve:prime256v1 -nodes -days 2 -subj /CN=hook.example'.split(
        ' ',
      ),
      ...['-addext', 'subjectAltName=DNS:hook.example'],
      ...['-keyout', join(folder, 'key.pem'), '-out', join(folder, 'cert.pem')],
    ],
    { stdio: 'ignore' },
  );
  const read = (name: string) => readFileSync(join(folder, name));
  server = createServer({ key: read('key.pem'), cert: read('cert.pem') }, (_request, response) =>
    response.end('hello'),
  );
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
});
afterAll(async () => {
  server.closeAllConnections();
  await new Promise((resolve) => server.close(resolve));
  rmSync(folder, { recursive: true, force: true });
});

test('a certificate that nobody vouches for is refused, though the address is the one that was checked', async () => {
  const { port } = server.address() as AddressInfo;
  const call = callOutside(LOOPBACK, `https://hook.example:${port}/`, { resolve: here });
  await expect(call).rejects.toMatchObject({
    code: 'no-answer',
    message: expect.stringMatching(/SELF_SIGNED|UNABLE_TO/),
  });
});
