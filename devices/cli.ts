import { readFile } from 'node:fs/promises';
import { basename } from 'node:path';
import { parseArgs } from 'node:util';
import { NoAnswer, ServiceProblem } from './agent/api';
import { createDevice } from './agent/device';
import { enrol, renew } from './agent/enrol';
import { heartbeat } from './agent/heartbeat';
import { sendRecording } from './agent/upload';

const HELP = `npm run device -- COMMAND --origin URL --serial NUMBER --state FOLDER

  enrol CODE            exchange the code of the enrolment sheet for a credential
  send FILE...          send recordings (--type MEDIA, --site ID, --identifier TEXT)
  heartbeat             say how the device is, hear the time
  renew                 renew the credential
  status                what the state folder holds`;

const { values, positionals } = parseArgs({
  allowPositionals: true,
  options: {
    origin: { type: 'string' },
    serial: { type: 'string' },
    state: { type: 'string' },
    type: { type: 'string', default: 'audio/wav' },
    site: { type: 'string' },
    identifier: { type: 'string' },
    help: { type: 'boolean', default: false },
  },
});
const [command, ...rest] = positionals;
if (values.help || !command || !values.origin || !values.serial || !values.state) {
  console.log(HELP);
  process.exit(values.help ? 0 : 2);
}

const device = await createDevice({
  origin: values.origin.replace(/\/+$/, ''),
  serialNumber: values.serial,
  stateFolder: values.state,
});
try {
  switch (command) {
    case 'enrol': {
      const answer = await enrol(device, rest[0] ?? '');
      console.log(
        `${answer.assetTag} is enrolled with ${answer.credentialId}, until ${new Date(answer.expiresAt).toISOString()}`,
      );
      break;
    }
    case 'send':
      for (const file of rest) {
        const { answer } = await sendRecording(device, {
          recordingNumber: `${Date.now().toString(36)}-${basename(file)}`.slice(0, 64),
          bytes: await readFile(file),
          mediaType: values.type,
          recordedAt: device.clock.now(),
          ...(values.site ? { site: values.site as never } : {}),
          ...(values.identifier ? { scannedIdentifier: values.identifier } : {}),
        });
        console.log(
          `${file}: ${answer.verdict}, ${answer.recording}${answer.reasons[0] ? `. ${answer.reasons[0].meaning} ${answer.reasons[0].action}` : ''}`,
        );
      }
      break;
    case 'heartbeat':
      console.log(JSON.stringify(await heartbeat(device)));
      break;
    case 'renew':
      console.log(`renewed: ${(await renew(device)).credentialId}`);
      break;
    case 'status':
      console.log(
        device.credential
          ? `${device.credential.assetTag}, ${device.credential.credentialId} until ${new Date(device.credential.expiresAt).toISOString()}`
          : 'not enrolled',
      );
      break;
    default:
      console.log(HELP);
      process.exitCode = 2;
  }
} catch (error) {
  if (error instanceof ServiceProblem)
    console.error(`${error.problem.title} (${error.code}). ${error.problem.detail ?? ''}`);
  else if (error instanceof NoAnswer)
    console.error(`No answer from ${values.origin}. Try again; nothing is lost.`);
  else throw error;
  process.exitCode = 1;
}
