import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { createDecoder, decodeWhole, mediaTypesOf, sniffContainer } from '@/lib/acoustics/decode/decode';
import { matchesMediaType } from '@/lib/acoustics/decode/sniff';
import { soundRoom } from '../../../support/sound';
import { bytesOf, chunk, plainWav, riff, u32 } from './build';

let room: ReturnType<typeof soundRoom>;
beforeAll(() => {
  room = soundRoom();
  room.sox('-R', '-n', '-r', '8000', '-b', '16', 's.wav', 'synth', '0.5', 'sine', '300');
  room.ffmpeg('-i', 's.wav', '-frames:a', '20', '-c:a', 'aac', 'adts.aac');
  room.ffmpeg('-i', 's.wav', '-c:a', 'aac', 'sound.m4a');
  room.ffmpeg('-i', 's.wav', 'sound.aiff');
  room.ffmpeg('-i', 's.wav', 'sound.caf');
  room.ffmpeg('-i', 's.wav', 'sound.au');
  room.ffmpeg('-i', 's.wav', '-c:a', 'libopus', 'sound.webm');
  room.ffmpeg('-i', 's.wav', '-c:a', 'mp2', 'sound.mp2');
  room.ffmpeg('-i', 's.wav', '-c:a', 'adpcm_ms', 'adpcm.wav');
  room.ffmpeg('-f', 'lavfi', '-i', 'color=red:16x16', '-frames:v', '1', 'a.png');
  room.ffmpeg('-f', 'lavfi', '-i', 'color=red:16x16', '-frames:v', '1', 'a.jpg');
  room.ffmpeg('-f', 'lavfi', '-i', 'color=red:16x16', '-frames:v', '2', 'a.avi');
});
afterAll(() => room.close());

test.each([
  ['adts.aac', 'aac'],
  ['sound.m4a', 'mp4'],
  ['sound.aiff', 'aiff'],
  ['sound.caf', 'sound-other'],
  ['sound.au', 'sound-other'],
  ['sound.webm', 'matroska'],
  ['sound.mp2', 'unknown'],
  ['a.png', 'image'],
  ['a.jpg', 'image'],
  ['a.avi', 'riff-other'],
])('%s is unreadable and known for %s', async (name, sniffed) => {
  expect(await decodeWhole(room.read(name), 'audio/wav')).toMatchObject({
    ok: false,
    failure: 'unreadable',
    reason: `content-is-${sniffed}`,
    sniffed,
    typeMatches: false,
    format: null,
    frames: 0,
  });
});

test('a WAV whose sound is packed in a way that is not read says so', async () => {
  expect(await decodeWhole(room.read('adpcm.wav'))).toMatchObject({
    failure: 'unreadable',
    reason: 'format-unknown',
  });
});

test.each([
  ['a page', '<!DOCTYPE html><title>x</title>', 'html'],
  ['a page behind a byte order mark', '\u00ef\u00bb\u00bf<html>', 'html'],
  ['XML', '<?xml version="1.0"?>', 'html'],
  ['text', 'The recording is on the other stick.\n', 'text'],
  ['JSON', '{"ok":true}', 'text'],
  ['an archive', 'PK\u0003\u0004\u0014', 'archive'],
  ['a document', '%PDF-1.7', 'document'],
  ['a picture in RIFF', 'RIFF\u0010\u0000\u0000\u0000WEBPVP8 ', 'riff-other'],
  ['zeros', '\u0000'.repeat(200), 'unknown'],
])('%s is unreadable', async (_name, text, sniffed) => {
  expect(await decodeWhole(bytesOf(text))).toMatchObject({
    failure: 'unreadable',
    reason: `content-is-${sniffed}`,
    sniffed,
  });
});

test('a file without a byte is unreadable for that reason', async () => {
  const expected = { ok: false, failure: 'unreadable', reason: 'no-bytes', sniffed: 'nothing', format: null };
  expect(await decodeWhole(new Uint8Array(0))).toMatchObject(expected);
  const untouched = createDecoder({ onFormat: () => undefined, onBlock: () => undefined });
  expect(await untouched.end()).toMatchObject(expected);
});

test('bytes at random are never sound', async () => {
  let state = 12_345;
  const noise = Uint8Array.from({ length: 100_000 }, () => {
    state = (Math.imul(state, 1_103_515_245) + 12_345) >>> 0;
    return state >>> 24;
  });
  for (let at = 0; at < 2000; at += 20)
    expect((await decodeWhole(noise.subarray(at, at + 5000))).ok).toBe(false);
  // Not even where they begin like a frame of MP3.
  expect(await decodeWhole(bytesOf([0xff, 0xfb, 0x90, 0x00], noise))).toMatchObject({
    sniffed: 'mp3',
    failure: 'unreadable',
    reason: 'no-frames',
  });
});

describe('media types', () => {
  test('each container is sent under its types, whatever their case and parameters', () => {
    expect(mediaTypesOf('wav')).toEqual(['audio/wav', 'audio/wave', 'audio/x-wav', 'audio/vnd.wave']);
    expect(mediaTypesOf('rf64')).toEqual(mediaTypesOf('wav'));
    expect(mediaTypesOf('flac')).toEqual(['audio/flac', 'audio/x-flac']);
    expect(mediaTypesOf('mp3')).toEqual(['audio/mpeg', 'audio/mp3']);
    for (const type of ['audio/ogg', 'audio/opus', 'application/ogg'])
      expect(mediaTypesOf('ogg')).toContain(type);
    expect(matchesMediaType('Audio/WAV; codecs=1', 'wav', 'pcm-s16')).toBe(true);
    expect(matchesMediaType('audio/flac', 'wav', 'pcm-s16')).toBe(false);
    expect(matchesMediaType('text/html', 'html', null)).toBe(false);
  });
  test('a type that names a codec matches only that codec', () => {
    expect(matchesMediaType('audio/opus', 'ogg', 'opus')).toBe(true);
    expect(matchesMediaType('audio/opus', 'ogg', 'vorbis')).toBe(false);
    expect(matchesMediaType('audio/flac', 'ogg', 'flac')).toBe(true);
    expect(matchesMediaType('audio/ogg', 'ogg', 'vorbis')).toBe(true);
  });
  test('content under a wrong type is read all the same, and the mismatch told', async () => {
    const wav = plainWav([1, 2, 3]);
    expect(await decodeWhole(wav, 'audio/flac')).toMatchObject({
      ok: true,
      typeMatches: false,
      sniffed: 'wav',
    });
    expect(await decodeWhole(wav, 'audio/x-wav')).toMatchObject({ ok: true, typeMatches: true });
    expect(await decodeWhole(wav)).toMatchObject({ ok: true, typeMatches: true });
  });
});

test('the first bytes are enough to know a file by', () => {
  expect(sniffContainer(plainWav([0]))).toBe('wav');
  expect(sniffContainer(bytesOf('RF64', u32(0), 'WAVE'))).toBe('rf64');
  expect(sniffContainer(bytesOf('OggS'))).toBe('ogg');
  expect(sniffContainer(bytesOf('fLaC'))).toBe('flac');
  expect(sniffContainer(bytesOf('ID3\u0004'))).toBe('mp3');
  expect(sniffContainer(new Uint8Array(0))).toBe('nothing');
  expect(sniffContainer(riff([chunk('JUNK', [])]))).toBe('wav');
});
