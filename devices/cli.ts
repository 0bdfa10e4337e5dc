import { NoAnswer, ServiceProblem } from './agent/answers';
import { createDevice, type Device } from './agent/device';
import { type Disk, folderDisk } from './agent/disk';
import { enrol } from './agent/enrol';
import { heartbeat } from './agent/heartbeat';
import { FolderHeld, holdFolder } from './agent/hold';
import { openQueue } from './agent/queue';
import { renew } from './agent/renew';
import { readState, StateUnreadable } from './agent/state';
import { type Arguments, HELP, readArguments, WrongUse } from './command/arguments';
import { keepRunning } from './command/run';
import { sendWaiting, takeFiles } from './command/send';
import { showStatus } from './command/status';

/** The device of the state folder; a new one only for enrolment. */
async function wake(args: Arguments, disk: Disk): Promise<Device> {
  const state = await readState(disk);
  const origin = args.origin ?? state?.origin;
  const serialNumber = args.serial ?? state?.serialNumber;
  if (!origin) throw new WrongUse('--origin URL is needed');
  if (!serialNumber) throw new WrongUse('--serial NUMBER is needed');
  if (!state && args.command !== 'enrol') throw new WrongUse('the device is not enrolled: enrol it first');
  const device = await createDevice({
    origin,
    serialNumber,
    stateFolder: args.state,
    disk,
    keyType: args.keyType,
  });
  if (!device.credential && args.command !== 'enrol')
    throw new WrongUse(`the device is not enrolled at ${origin}: enrol it first`);
  return device;
}

async function withDevice(args: Arguments, disk: Disk): Promise<number> {
  const queue = await openQueue(disk);
  if (args.command === 'send') await takeFiles(queue, args.rest, args);
  const device = await wake(args, disk);
  switch (args.command) {
    case 'enrol': {
      if (args.rest.length !== 1) throw new WrongUse('enrol takes the code of the enrolment sheet');
      const answer = await enrol(device, args.rest[0] ?? '', args.firmware ?? undefined);
      console.log(
        `${answer.assetTag} is enrolled with ${answer.credentialId} until ${new Date(answer.expiresAt).toISOString()}`,
      );
      return 0;
    }
    case 'send':
      return await sendWaiting(device, queue);
    case 'heartbeat': {
      const answer = await heartbeat(device, {
        ...(args.batteryPercent === null ? {} : { batteryPercent: Math.round(args.batteryPercent) }),
        ...(args.firmware === null ? {} : { firmware: args.firmware }),
      });
      console.log(JSON.stringify(answer));
      return 0;
    }
    case 'renew':
      console.log(`renewed: ${(await renew(device)).credentialId}`);
      return 0;
    default: {
      const ending = new AbortController();
      for (const signal of ['SIGINT', 'SIGTERM'] as const) process.once(signal, () => ending.abort());
      await keepRunning(device, queue, args, ending.signal);
      return 0;
    }
  }
}

/** Refused clips in line again, or one given up. */
async function sortOut(args: Arguments, disk: Disk): Promise<number> {
  const queue = await openQueue(disk);
  const [number] = args.rest;
  const wanted = (await queue.list()).filter(
    ({ recordingNumber, place, journal }) =>
      journal.state !== 'completed' && (number === undefined || [recordingNumber, place].includes(number)),
  );
  if (number !== undefined && wanted.length === 0)
    throw new WrongUse(`no unsent recording is called ${number}`);
  if (args.command === 'drop' && number === undefined) throw new WrongUse('drop takes one number');
  for (const { place, journal } of wanted) {
    if (args.command === 'drop') await queue.drop(place);
    else if (journal.state === 'refused') await queue.tryAgain(place);
  }
  console.log(`${wanted.length} ${args.command === 'drop' ? 'given up' : 'in line'}`);
  return 0;
}

const HOLDING = ['enrol', 'send', 'run', 'heartbeat', 'renew', 'retry', 'drop'];

async function main(): Promise<number> {
  const args = readArguments(process.argv.slice(2));
  if (!args) {
    console.log(HELP);
    return 0;
  }
  const disk = folderDisk(args.state);
  if (args.command === 'status') {
    await showStatus(disk, args.json);
    return 0;
  }
  // Taking into the queue is safe beside a running device, which finds the clips in its next round.
  if (args.command === 'send' && args.later) {
    await takeFiles(await openQueue(disk), args.rest, args);
    return 0;
  }
  if (!HOLDING.includes(args.command)) throw new WrongUse(`${args.command} is no command`);
  const letGo = await holdFolder(args.state);
  try {
    return ['retry', 'drop'].includes(args.command)
      ? await sortOut(args, disk)
      : await withDevice(args, disk);
  } finally {
    await letGo();
  }
}

function complain(error: unknown): number {
  if (error instanceof WrongUse) {
    console.error(`${error.message}\n\nnpm run device -- --help tells more.`);
    return 2;
  }
  if (error instanceof ServiceProblem) {
    const { title, detail } = error.problem;
    const call = error.requestId ? ` Request ${error.requestId}.` : '';
    console.error(`${title} (${error.code || error.status}). ${detail ?? ''}${call}`);
    return 1;
  }
  if (error instanceof NoAnswer) {
    console.error('No answer from the service. Try again; nothing is lost.');
    return 3;
  }
  if (error instanceof FolderHeld || error instanceof StateUnreadable) {
    console.error(error.message);
    return 4;
  }
  throw error;
}

process.exitCode = await main().catch(complain);
