import type { Database } from '@/db/client';
import type { Mail } from '@/lib/mail/port';
import type { Storage } from '@/lib/storage/port';
import type { Clock } from './clock';
import type { Env } from './env';
import type { Log } from './log';
import type { SecretBox } from './secretBox';

/** What a verb may need. Verbs ask for the part they use (`Pick<Services, 'write' | 'clock'>`). */
export interface Services extends Pick<Database, 'read' | 'write'> {
  database: Database;
  storage: Storage;
  mail: Mail;
  clock: Clock;
  log: Log;
  env: Env;
  secrets: SecretBox;
}
