import { mkdir, rename, writeFile } from 'node:fs/promises';
import { join } from 'node:path';
import nodemailer from 'nodemailer';
import { newId } from '@/lib/platform/ids';
import type { Mail } from './port';

/** Well within the lease of the outbox, so that a slow server does not get the same message twice. */
const TIMEOUTS = { connectionTimeout: 10_000, greetingTimeout: 10_000, socketTimeout: 20_000 };

/** Mail by SMTP, or, without a server to send by, as files that can be opened in any mail program. */
export function createMail(config: { smtpUrl: string | undefined; folder: string; from: string }): Mail {
  if (config.smtpUrl) {
    const transport = nodemailer.createTransport({ url: config.smtpUrl, ...TIMEOUTS });
    return {
      kind: 'smtp',
      async send(message) {
        await transport.sendMail({ from: config.from, ...message });
      },
    };
  }
  const transport = nodemailer.createTransport({ streamTransport: true, buffer: true, newline: 'unix' });
  return {
    kind: 'folder',
    async send(message) {
      const { message: bytes } = await transport.sendMail({ from: config.from, ...message });
      await mkdir(config.folder, { recursive: true });
      const slug = message.subject
        .toLowerCase()
        .replace(/[^a-z0-9]+/g, '-')
        .replace(/^-|-$/g, '')
        .slice(0, 60);
      const name = `${new Date().toISOString().replace(/[:.]/g, '-')}-${slug}-${newId().slice(0, 8)}.eml`;
      const fresh = join(config.folder, `.${name}`);
      await writeFile(fresh, bytes as unknown as Uint8Array);
      await rename(fresh, join(config.folder, name));
    },
  };
}
