import { mkdtemp, readdir, readFile, rm } from 'node:fs/promises';
import type { AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { SMTPServer } from 'smtp-server';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { createMail } from '@/lib/mail/nodemailer';

const FROM = 'Bellkeep <bellkeep@harrowmere.example>';
const MESSAGE = {
  to: 'amara@harrowmere.example',
  subject: 'You are invited: ../../etc/passwd',
  text: 'Grüße.\nOpen https://bellkeep.test/invite/abc',
};

let folder: string;
beforeEach(async () => {
  folder = await mkdtemp(join(tmpdir(), 'bellkeep-mail-'));
});
afterEach(() => rm(folder, { recursive: true, force: true }));

describe('without a mail server', () => {
  test('a message is a file that a mail program opens, with a name that says what it is', async () => {
    const mail = createMail({ smtpUrl: undefined, folder: join(folder, 'out'), from: FROM });
    await mail.send(MESSAGE);
    const names = await readdir(join(folder, 'out'));
    expect(names).toHaveLength(1);
    expect(names[0]).toMatch(/^\d{4}-\d\d-\d\dT[\d-]+Z-you-are-invited-etc-passwd-[0-9a-f]{8}\.eml$/);
    const text = await readFile(join(folder, 'out', names[0] ?? ''), 'utf8');
    expect(text).toMatch(/^From: Bellkeep <bellkeep@harrowmere\.example>$/m);
    expect(text).toMatch(/^To: amara@harrowmere\.example$/m);
    expect(text).toContain('https://bellkeep.test/invite/abc');
  });

  test('two at the same moment are two files', async () => {
    const mail = createMail({ smtpUrl: undefined, folder, from: FROM });
    await Promise.all([mail.send(MESSAGE), mail.send(MESSAGE)]);
    expect(await readdir(folder)).toHaveLength(2);
  });

  test('a line end in a subject or an address starts no field of its own', async () => {
    const mail = createMail({ smtpUrl: undefined, folder, from: FROM });
    await mail.send({ ...MESSAGE, subject: 'Hello\r\nBcc: everybody@evil.example' });
    const [name = ''] = await readdir(folder);
    const head = (await readFile(join(folder, name), 'utf8')).split(/\r?\n\r?\n/, 1)[0];
    expect(head).not.toMatch(/^Bcc:/im);
  });
});

describe('with a mail server', () => {
  async function serverThat(onData: (text: string) => Error | null) {
    const server = new SMTPServer({
      authOptional: true,
      disabledCommands: ['STARTTLS'],
      onData(stream, _session, done) {
        const chunks: Buffer[] = [];
        stream.on('data', (chunk: Buffer) => chunks.push(chunk));
        stream.on('end', () => done(onData(Buffer.concat(chunks).toString())));
      },
    });
    await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', () => resolve()));
    const { port } = server.server.address() as AddressInfo;
    return { server, url: `smtp://127.0.0.1:${port}` };
  }

  test('a message is handed over to it', async () => {
    const received: string[] = [];
    const { server, url } = await serverThat((text) => {
      received.push(text);
      return null;
    });
    const mail = createMail({ smtpUrl: url, folder, from: FROM });
    await mail.send(MESSAGE);
    server.close();
    expect(received).toHaveLength(1);
    expect(received[0]).toContain('To: amara@harrowmere.example');
    expect(await readdir(folder)).toEqual([]);
  });

  test('a message that it refuses is not taken for sent', async () => {
    const { server, url } = await serverThat(() => new Error('mailbox is full'));
    const mail = createMail({ smtpUrl: url, folder, from: FROM });
    await expect(mail.send(MESSAGE)).rejects.toThrow('mailbox is full');
    server.close();
  });

  test('a server that is not there is an error', async () => {
    const mail = createMail({ smtpUrl: 'smtp://127.0.0.1:9', folder, from: FROM });
    await expect(mail.send(MESSAGE)).rejects.toThrow();
  });
});
