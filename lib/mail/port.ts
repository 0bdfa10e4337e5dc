import { z } from 'zod';

/** A message in plain text and plain words. */
export const Message = z.object({ to: z.string(), subject: z.string(), text: z.string() });
export type Message = z.infer<typeof Message>;

export interface Mail {
  /** @throws Error when the message was not handed over */
  send(message: Message): Promise<void>;
  /** Where messages go, for the health page: no credentials in it. */
  readonly kind: 'smtp' | 'folder';
}
