import { execFileSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { ensureDebian } from './debian';

/** A folder for sound files, and the general-purpose tools that make and measure them (Debian's sox, ffmpeg, flac). */
export function soundRoom() {
  if (!ensureDebian(['sox', 'ffmpeg', 'flac']))
    throw new Error('sox, ffmpeg and flac are needed (Debian packages)');
  const folder = mkdtempSync(join(tmpdir(), 'bellkeep-sound-'));
  const at = (name: string) => join(folder, name);
  const run = (command: string, args: string[]) =>
    execFileSync(command, args, { cwd: folder, stdio: ['ignore', 'pipe', 'pipe'], maxBuffer: 1 << 28 });
  return {
    at,
    sox: (...args: string[]) => run('sox', args),
    flac: (...args: string[]) => run('flac', ['-s', '-f', ...args]),
    ffmpeg: (...args: string[]) => run('ffmpeg', ['-y', '-loglevel', 'error', ...args]),
    /** What `sox FILE -n stats` prints, which it prints on its error output. */
    stats: (name: string) =>
      execFileSync('sh', ['-c', `sox "${name}" -n stats 2>&1`], { cwd: folder, encoding: 'utf8' }),
    read: (name: string) => new Uint8Array(readFileSync(at(name))),
    /** The file's samples as sox reads them, 32-bit float, channels interleaved. */
    samples: (name: string) => {
      const bytes = run('sox', ['-D', name, '-t', 'f32', '-']);
      return new Float32Array(bytes.buffer.slice(bytes.byteOffset, bytes.byteOffset + bytes.byteLength));
    },
    close: () => rmSync(folder, { recursive: true, force: true }),
  };
}
