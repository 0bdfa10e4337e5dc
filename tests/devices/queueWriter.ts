import { folderDisk } from '@/devices/agent/disk';
import { openQueue } from '@/devices/agent/queue';

// Takes clips into a queue until it is killed, and says after each that it is safe.
const [folder, first] = process.argv.slice(2);
const queue = await openQueue(folderDisk(folder ?? ''));
for (let n = Number(first); ; n++) {
  await queue.add({
    recordingNumber: `clip-${n}`,
    bytes: new Uint8Array(20_000).fill(n),
    mediaType: 'audio/wav',
    recordedAt: 1_800_000_000_000 + n,
  });
  process.stdout.write(`${n}\n`);
}
