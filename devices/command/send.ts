import { readFile, stat } from 'node:fs/promises';
import { basename, extname } from 'node:path';
import { z } from 'zod';
import type { Clip } from '../agent/clip';
import { deviceTime } from '../agent/clock';
import type { Device } from '../agent/device';
import { type Drained, drainQueue, type QueueEvent } from '../agent/drain';
import { sha256Hex } from '../agent/entry';
import { NumberTaken, type Queue } from '../agent/queue';
import { type Arguments, WrongUse } from './arguments';

const MEDIA_TYPES: Record<string, string> = {
  '.wav': 'audio/wav',
  '.flac': 'audio/flac',
  '.ogg': 'audio/ogg',
  '.opus': 'audio/ogg',
  '.mp3': 'audio/mpeg',
};

/**
 * A file as a clip. Its number is made of its content and its time is that of the file, so that the same file sent
 * twice is one recording.
 */
async function clipOfFile(file: string, args: Arguments): Promise<Clip> {
  const mediaType = args.mediaType ?? MEDIA_TYPES[extname(file).toLowerCase()];
  if (!mediaType) throw new WrongUse(`${file}: say --type`);
  let bytes: Uint8Array;
  let modified: number;
  try {
    [bytes, modified] = await Promise.all([readFile(file), stat(file).then((facts) => facts.mtimeMs)]);
  } catch (error) {
    throw new WrongUse(`${file} cannot be read: ${error instanceof Error ? error.message : error}`);
  }
  return {
    recordingNumber: `${sha256Hex(bytes).slice(0, 12)}-${basename(file).replace(/\p{C}/gu, '')}`.slice(0, 64),
    bytes,
    mediaType,
    recordedAt: deviceTime(modified),
    ...(args.site ? { site: args.site } : {}),
    ...(args.side ? { chestpieceSide: args.side } : {}),
    ...(args.identifier ? { scannedIdentifier: args.identifier } : {}),
  };
}

/** Take files into the queue, all or none. @throws WrongUse */
export async function takeFiles(queue: Queue, files: string[], args: Arguments): Promise<void> {
  if (files.length === 0) throw new WrongUse('name at least one file');
  const clips = [];
  for (const file of files) clips.push(await clipOfFile(file, args));
  for (const clip of clips) {
    try {
      await queue.add(clip);
    } catch (error) {
      if (error instanceof z.ZodError) throw new WrongUse(z.prettifyError(error));
      if (error instanceof NumberTaken) throw new WrongUse(error.message);
      throw error;
    }
  }
}

const WORDS = { usable: 'usable', care: 'use with care', repeat: 'record again' };

function said(event: QueueEvent): string {
  const name = event.entry.recordingNumber ?? event.entry.place;
  switch (event.kind) {
    case 'sent': {
      const { answer } = event;
      const worst = answer.reasons.find((reason) => reason.severity === answer.verdict);
      return `${name}: ${WORDS[answer.verdict]}, ${answer.recording}${worst ? `. ${worst.meaning} ${worst.action}` : ''}`;
    }
    case 'refused':
      return `${name}: refused, ${event.problem.message} (${event.problem.code}). It stays on the device.`;
    case 'damaged':
      return `${name}: its bytes on the disk are no longer what was recorded. It stays as it is.`;
    case 'put-off':
      return `${name}: not sent yet, ${event.cause.message}`;
  }
}

/** Send what waits and tell of each. @returns the exit code */
export async function sendWaiting(device: Device, queue: Queue, signal?: AbortSignal): Promise<number> {
  const drained: Drained = await drainQueue(device, queue, (event) => console.log(said(event)), signal);
  if (drained.refused > 0) return 1;
  return drained.waiting > 0 ? 3 : 0;
}
