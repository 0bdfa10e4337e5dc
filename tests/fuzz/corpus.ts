import { soundRoom } from '../support/sound';

export interface Sample {
  name: string;
  bytes: Uint8Array;
}

const SOX: [name: string, args: string[]][] = [
  ['u8.wav', ['-b', '8']],
  ['s16.wav', ['-b', '16']],
  ['s24.wav', ['-b', '24']],
  ['f32.wav', ['-b', '32', '-e', 'floating-point']],
  ['alaw.wav', ['-e', 'a-law']],
];
const FFMPEG: [name: string, args: string[]][] = [
  ['long.wav', ['-c:a', 'pcm_s16le', '-rf64', 'always']],
  ['f.oga', ['-c:a', 'flac']],
  ['opus.ogg', ['-c:a', 'libopus', '-b:a', '24k']],
  ['vorbis.ogg', ['-c:a', 'libvorbis']],
  ['tagged.mp3', ['-c:a', 'libmp3lame', '-ar', '16000']],
  ['bare.mp3', ['-c:a', 'libmp3lame', '-write_xing', '0', '-id3v2_version', '0']],
  ['not.aac', ['-c:a', 'aac']],
  ['not.aiff', []],
];

/** One short file of every kind that is read, and some that are not: what mutations begin with. */
export function soundCorpus(): Sample[] {
  const room = soundRoom();
  try {
    room.sox(
      ...['-R', '-n', '-r', '8000', '-b', '16', '-c', '2', 'source.wav', 'synth', '0.7'],
      ...['pinknoise', 'sine', '300', 'gain', '-6'],
    );
    for (const [name, args] of SOX) room.sox('-D', 'source.wav', ...args, name);
    for (const [name, args] of FFMPEG) room.ffmpeg('-bitexact', '-i', 'source.wav', ...args, name);
    room.flac('-o', 'native.flac', 'source.wav');
    room.flac('-l', '0', '-b', '256', '--no-padding', '-o', 'fixed.flac', 'u8.wav');
    const names = [...SOX, ...FFMPEG].map(([name]) => name);
    return [...names, 'native.flac', 'fixed.flac'].map((name) => ({ name, bytes: room.read(name) }));
  } finally {
    room.close();
  }
}
