import type { z } from 'zod';
import { SlotRequest } from '@/lib/contract/device';

/** What is said of a clip besides its bytes: what the slot request says, without what changes from call to call. */
export const ClipFacts = SlotRequest.omit({ sha256: true, bytes: true, deviceTime: true });

/** One recording as the device has it. The same clip always goes under the same recording number. */
export type Clip = z.infer<typeof ClipFacts> & { bytes: Uint8Array };
