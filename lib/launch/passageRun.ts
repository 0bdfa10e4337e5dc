import { mkdtemp, readFile, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { basename, extname, join } from 'node:path';
import { applyMigrations } from '@/db/migrate';
import { ServiceProblem } from '@/devices/agent/api';
import { createDevice, type Device } from '@/devices/agent/device';
import { enrol } from '@/devices/agent/enrol';
import { type Sent, sendRecording } from '@/devices/agent/upload';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { issueEnrolmentCode } from '@/lib/enrolment/issueCode';
import { addDevice } from '@/lib/fleet/addDevice';
import { describeModel } from '@/lib/fleet/describeModel';
import { createServices } from '@/lib/http/services';
import { readEnv } from '@/lib/platform/env';
import { freePort, Household, untilAnswers } from './processes.mjs';
import { localSettings, storageFakeArgs, webArgs } from './settings.mjs';

const MEDIA_TYPES: Record<string, string> = {
  '.wav': 'audio/wav',
  '.wave': 'audio/wav',
  '.rf64': 'audio/wav',
  '.bw64': 'audio/wav',
  '.flac': 'audio/flac',
  '.fla': 'audio/flac',
  '.ogg': 'audio/ogg',
  '.oga': 'audio/ogg',
  '.opus': 'audio/ogg',
  '.mp3': 'audio/mpeg',
};
const SERIAL = 'PASSAGE-1';

interface Arguments {
  json: boolean;
  modelRateHz: number | null;
  files: string[];
}

function readArguments(args: string[]): Arguments | string {
  const read: Arguments = { json: false, modelRateHz: null, files: [] };
  for (let i = 0; i < args.length; i++) {
    const arg = args[i] ?? '';
    if (arg === '--json') read.json = true;
    else if (arg === '--model-rate') {
      read.modelRateHz = Number(args[++i]);
      if (!(read.modelRateHz >= 500 && read.modelRateHz <= 192_000))
        return '--model-rate takes a sample rate in Hz, 500 to 192000';
    } else if (arg === '--') {
      read.files.push(...args.slice(i + 1));
      break;
    } else if (arg.startsWith('--')) return `${arg} is not known`;
    else read.files.push(arg);
  }
  return read.files.length === 0 ? 'name at least one file' : read;
}

/** What the web server would leave on disk of this: nothing. The device is described, listed and given a code here. */
async function prepare(settings: Record<string, string>, modelRateHz: number | null): Promise<string> {
  const services = await createServices(readEnv({ ...settings, LOG_LEVEL: 'silent' }));
  await applyMigrations(services.database);
  const modelId = await describeModel(services, SERVICE_ACTOR, {
    maker: 'Any',
    name: 'Any model',
    sampleRatesHz: modelRateHz === null ? [] : [modelRateHz],
    bitDepths: [],
    mediaTypes: [...new Set(Object.values(MEDIA_TYPES))],
    allowLossy: false,
    longestClipSeconds: 86_400,
    fullScaleNote: null,
    checkIntervalDays: 365,
    signsRequests: true,
  });
  const deviceId = await addDevice(services, SERVICE_ACTOR, {
    assetTag: 'PASSAGE',
    serialNumber: SERIAL,
    modelId,
    wardId: null,
    udi: null,
    lot: null,
    firmware: null,
  });
  const { code } = await issueEnrolmentCode(services, SERVICE_ACTOR, deviceId);
  services.database.close();
  return code;
}

interface Line {
  file: string;
  accepted: boolean;
  problem: { type: string; title: string; status: number } | null;
  sent: Sent | null;
}

async function sendFile(device: Device, file: string, n: number): Promise<Line> {
  const bytes = await readFile(file).catch(() => null);
  if (bytes === null) {
    // Nothing was sent: there is no such file, or it may not be read.
    return {
      file,
      accepted: false,
      problem: { type: 'about:blank', title: 'The file could not be read', status: 0 },
      sent: null,
    };
  }
  const mediaType = MEDIA_TYPES[extname(file).toLowerCase()] ?? 'application/octet-stream';
  try {
    const sent = await sendRecording(device, {
      recordingNumber: `${n}-${basename(file)}`.replace(/\p{C}/gu, '').slice(0, 64),
      bytes,
      mediaType,
      recordedAt: device.clock.now(),
    });
    return { file, accepted: true, problem: null, sent };
  } catch (error) {
    if (!(error instanceof ServiceProblem) || error.status >= 500) throw error;
    const { type, title, status } = error.problem;
    return { file, accepted: false, problem: { type, title, status }, sent: null };
  }
}

const asJson = ({ file, accepted, problem, sent }: Line): string => {
  const answer = sent?.answer;
  const measures = (answer?.measures ?? {}) as Record<string, unknown>;
  return JSON.stringify({
    file,
    accepted,
    problem,
    recording: answer?.recording ?? null,
    verdict: answer?.verdict ?? null,
    sha256: answer?.sha256 ?? null,
    sampleRate: measures.sampleRateHz ?? null,
    bitDepth: measures.bitDepth ?? null,
    channels: measures.channels ?? null,
    durationSeconds: answer?.durationSeconds ?? null,
    findings: answer?.findings ?? [],
    measures: answer?.measures ?? {},
    filing: answer?.filing ?? null,
    custodyEntries: answer?.custodyEntries ?? 0,
    milliseconds: sent
      ? Object.fromEntries(
          Object.entries(sent.milliseconds).map(([step, ms]) => [step, Math.round(ms * 10) / 10]),
        )
      : null,
  });
};

const WORDS = { usable: 'usable', care: 'use with care', repeat: 'record again' };
const asText = ({ file, problem, sent }: Line): string => {
  if (!sent) return `${file}: refused, ${problem?.title ?? ''} (${problem?.type.split('/').at(-1) ?? ''})`;
  const { answer } = sent;
  const reasons = answer.reasons
    .filter((reason) => reason.severity !== 'note')
    .map((reason) => reason.title.toLowerCase());
  return `${file}: ${WORDS[answer.verdict]}${reasons.length > 0 ? ` (${reasons.join(', ')})` : ''}, ${answer.recording}, ${(answer.durationSeconds ?? 0).toFixed(2)} s, SHA-256 ${answer.sha256}`;
};

async function main(): Promise<number> {
  const read = readArguments(process.argv.slice(2));
  if (typeof read === 'string') {
    console.error(`${read}\nnpm run passage -- [--json] [--model-rate HZ] FILE...`);
    return 2;
  }
  const folder = await mkdtemp(join(tmpdir(), 'bellkeep-passage-'));
  const household = new Household();
  const stop = async () => {
    await household.stop();
    await rm(folder, { recursive: true, force: true });
  };
  for (const signal of ['SIGINT', 'SIGTERM'] as const)
    process.on(signal, () => void stop().then(() => process.exit(130)));
  let faults = 0;
  try {
    const ports = { webPort: await freePort(), storagePort: await freePort() };
    const settings = {
      ...localSettings({ folder, ...ports }),
      LOG_LEVEL: 'warn',
      DEVICE_REQUESTS_PER_MINUTE: '100000',
    };
    const storage = household.start('the storage fake', storageFakeArgs(settings, folder));
    const code = await prepare(settings, read.modelRateHz);
    await untilAnswers(`${settings.S3_ENDPOINT}`, storage);
    const web = household.start('the web server', webArgs(ports.webPort), {
      env: { ...settings, NODE_ENV: 'production' },
    });
    await untilAnswers(`${settings.BELLKEEP_ORIGIN}/api/health`, web);
    const device = await createDevice({
      origin: settings.BELLKEEP_ORIGIN,
      serialNumber: SERIAL,
      stateFolder: null,
    });
    await enrol(device, code);
    for (const [i, file] of read.files.entries()) {
      try {
        const line = await sendFile(device, file, i + 1);
        console.log(read.json ? asJson(line) : asText(line));
      } catch (error) {
        faults++;
        reportFault(read.json, file, error);
        if (process.env.BELLKEEP_DEBUG) console.error(web.said.slice(-4000));
      }
    }
  } finally {
    await stop();
  }
  return faults > 0 ? 1 : 0;
}

function reportFault(json: boolean, file: string, error: unknown): void {
  const problem = error instanceof ServiceProblem ? error.problem : null;
  const title = problem?.title ?? (error instanceof Error ? error.message : String(error));
  console.error(`${file}: ${title}`);
  if (!json) return;
  const line = {
    file,
    accepted: false,
    problem: { type: problem?.type ?? 'about:blank', title, status: problem?.status ?? 0 },
    recording: null,
    verdict: null,
    sha256: null,
    sampleRate: null,
    bitDepth: null,
    channels: null,
    durationSeconds: null,
    findings: [],
    measures: {},
    filing: null,
    custodyEntries: 0,
    milliseconds: null,
  };
  console.log(JSON.stringify(line));
}

const code = await main().catch((error: unknown) => {
  console.error(error instanceof Error ? error.message : error);
  return 1;
});
process.exit(code);
