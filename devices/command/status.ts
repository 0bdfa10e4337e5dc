import type { Disk } from '../agent/disk';
import { loadKeys, thumbprintOf } from '../agent/keys';
import { readQueue } from '../agent/queue';
import { readState } from '../agent/state';

/** What the state folder holds, without waking the device: nothing is written and nobody is asked. */
export async function showStatus(disk: Disk, asJson: boolean): Promise<void> {
  const state = await readState(disk);
  const entries = await readQueue(disk);
  const count = (...states: string[]) =>
    entries.filter(({ journal }) => states.includes(journal.state)).length;
  const stuck = entries.filter(({ journal }) => journal.state === 'refused' || journal.state === 'damaged');
  const status = {
    serialNumber: state?.serialNumber ?? null,
    origin: state?.origin ?? null,
    keyThumbprint: state ? await thumbprintOf((await loadKeys(state.privateJwk)).publicJwk) : null,
    credential: state?.credential
      ? { id: state.credential.credentialId, expiresAt: new Date(state.credential.expiresAt).toISOString() }
      : null,
    queue: {
      waiting: count('queued', 'slotted', 'put'),
      sent: count('completed'),
      stuck: stuck.map(({ recordingNumber, place, journal }) => ({
        recordingNumber: recordingNumber ?? place,
        why: journal.state === 'refused' ? journal.title : 'damaged on the disk',
      })),
    },
  };
  if (asJson) {
    console.log(JSON.stringify(status));
    return;
  }
  const { credential, queue } = status;
  console.log(
    status.serialNumber ? `Device ${status.serialNumber}, key ${status.keyThumbprint}` : 'No device yet',
  );
  console.log(
    credential
      ? `Credential ${credential.id} until ${credential.expiresAt}, by ${status.origin}`
      : 'Not enrolled',
  );
  console.log(`${queue.waiting} waiting, ${queue.sent} sent, ${queue.stuck.length} refused or damaged`);
  for (const { recordingNumber, why } of queue.stuck) console.log(`  ${recordingNumber}: ${why}`);
}
