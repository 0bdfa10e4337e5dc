/** Custody entries in words. Made from the entry's kind and detail whenever it is shown; never stored. */

export interface WordedEntry {
  title: string;
  sentence: string;
  /** How the bead is drawn: what wants a look, what is somebody's access, the rest. */
  tone: 'plain' | 'access' | 'alarm';
}

interface EntryLike {
  kind: string;
  actor: { kind: string; label: string; role?: string };
  detail?: Record<string, unknown>;
  before?: Record<string, unknown>;
  after?: Record<string, unknown>;
}

const ROLE_WORDS: Record<string, string> = {
  biomed: 'biomedical engineer',
  clinician: 'clinician',
  itadmin: 'IT administrator',
  auditor: 'auditor',
};

const VERDICTS: Record<string, string> = { usable: 'usable', care: 'use with care', repeat: 'record again' };

const TITLES: Record<string, string> = {
  'log-opened': 'Log opened',
  'model-described': 'Model described',
  'device-added': 'Device added',
  'device-changed': 'Device changed',
  'device-state-changed': 'Service state changed',
  'device-firmware-changed': 'Firmware changed',
  'enrolment-code-issued': 'Enrolment code issued',
  'enrolment-code-refused': 'Enrolment refused',
  'device-enrolled': 'Enrolled',
  'credential-issued': 'Credential issued',
  'credential-renewal-asked': 'Renewal asked',
  'credential-renewed': 'Credential renewed',
  'credential-first-used': 'Credential first used',
  'credential-retired': 'Credential retired',
  'credential-revoked': 'Credential revoked',
  'credential-misused': 'Ended credential used',
  'signing-key-made': 'Signing key made',
  'credential-quarantined': 'Credential quarantined',
  'signing-key-superseded': 'Signing key superseded',
  'signing-key-distrusted': 'Signing key distrusted',
  'signing-key-retired': 'Signing key retired',
  'rotation-started': 'Rotation run started',
  'rotation-paused': 'Rotation run paused',
  'rotation-resumed': 'Rotation run resumed',
  'rotation-cancelled': 'Rotation run cancelled',
  'rotation-ended': 'Rotation run ended',
  'device-lost': 'Device lost',
  'slot-issued': 'Slot issued',
  'slot-refused': 'Slot refused',
  received: 'Received',
  'bytes-quarantined': 'Quarantined',
  sealed: 'Sealed',
  measured: 'Measured',
  filed: 'Filed',
  'filing-superseded': 'Moved to another encounter',
  'put-in-tray': 'Put in the tray',
  'kept-anyway': 'Kept anyway',
  heard: 'Heard',
  downloaded: 'Downloaded',
  'looked-at': 'Looked at',
  copied: 'Copied',
  exported: 'Exported',
  'evidence-asked': 'Evidence asked for',
  'evidence-decided': 'Evidence decided',
  'session-opened': 'Listening session opened',
  'session-closed': 'Listening session ended',
  'access-outside-wards': 'Looked outside their wards',
  'reading-signed': 'Reading signed',
  'person-invited': 'Invited',
  'invitation-withdrawn': 'Invitation withdrawn',
  'person-joined': 'Joined',
  'role-given': 'Role given',
  'role-taken': 'Role taken away',
  'wards-changed': 'Wards changed',
  'person-left': 'Left',
  'signed-in': 'Signed in',
  'sign-in-refused': 'Sign-in refused',
  'sessions-ended': 'Sessions ended',
  'second-factor-set': 'Second factor set',
  'second-factor-removed': 'Second factor removed',
  'password-reset': 'Password reset',
  'policy-changed': 'Policy changed',
  'connection-changed': 'Connection changed',
  'connection-tested': 'Connection tested',
  'passkey-added': 'Passkey added',
  'passkey-removed': 'Passkey removed',
  'sign-on-linked': 'Single sign-on linked',
  'client-created': 'API client made',
  'client-rotated': 'API client’s secret rotated',
  'client-revoked': 'API client revoked',
  'webhook-added': 'Webhook added',
  'webhook-changed': 'Webhook changed',
  'webhook-removed': 'Webhook removed',
  'delivery-repeated': 'Delivery repeated',
};

/** Why a clip went to the tray, in words. */
export const TRAY_WORDS: Record<string, string> = {
  'no-session': 'no listening session was open on the device, and nothing was scanned',
  'identifier-unknown': 'the scanned identifier is not known',
  'identifier-ambiguous': 'the scanned patient has more than one encounter at that time',
  'identifier-against-session': 'the scanned identifier and the listening session name different patients',
  'encounter-over': 'the scanned encounter was not running when the clip was recorded',
};

const ALARMS = new Set([
  'slot-refused',
  'bytes-quarantined',
  'credential-misused',
  'enrolment-code-refused',
  'filing-superseded',
  'access-outside-wards',
]);
const ACCESSES = new Set([
  'heard',
  'downloaded',
  'looked-at',
  'copied',
  'exported',
  'evidence-asked',
  'evidence-decided',
]);

const text = (value: unknown): string =>
  typeof value === 'string' ? value : typeof value === 'number' ? value.toLocaleString('en-GB') : '';
const short = (value: unknown): string => {
  const whole = text(value);
  return whole.length > 20 ? `${whole.slice(0, 8)}…${whole.slice(-6)}` : whole;
};
const join = (...parts: (string | false | undefined)[]): string => parts.filter(Boolean).join(', ');
const day = (value: unknown): string => (typeof value === 'string' ? value.slice(0, 10) : '');

/** Who did it: "Dr Solveig Adeyemi, clinician", "HM-0344", "Bellkeep". */
export function actorWords(actor: EntryLike['actor']): string {
  return actor.role ? `${actor.label}, ${ROLE_WORDS[actor.role] ?? actor.role}` : actor.label;
}

const plainList = (value: unknown): string =>
  Array.isArray(value) && value.length > 0 ? value.map(text).join(', ') : 'none';
const roleList = (value: unknown): string =>
  Array.isArray(value) ? value.map((role) => ROLE_WORDS[text(role)] ?? text(role)).join(', ') : '';

/** What was changed: each member before and after. */
const changeWords = (e: EntryLike): string =>
  Object.entries(e.after ?? {})
    .map(([name, after]) => `${name} ${String(e.before?.[name])} to ${String(after)}`)
    .join(', ');

type Sentence = (d: Record<string, unknown>, entry: EntryLike) => string;

const clockWords = (offset: unknown): string | false => {
  if (typeof offset !== 'number' || Math.abs(offset) < 1000) return false;
  const seconds = Math.abs(offset) / 1000;
  const size =
    seconds < 120
      ? `${seconds.toFixed(1)} s`
      : seconds < 7200
        ? `${Math.round(seconds / 60)} min`
        : seconds < 172_800
          ? `${Math.round(seconds / 3600)} h`
          : `${Math.round(seconds / 86_400)} days`;
  return `device clock ${size} ${offset < 0 ? 'slow' : 'fast'}`;
};

const SENTENCES: Record<string, Sentence> = {
  'slot-issued': (d) =>
    `${text(d.bytes)} bytes of ${text(d.mediaType)} admitted for ${Number(d.seconds) / 60} minutes`,
  'slot-refused': (d, e) => join(e.actor.label, `refused: ${text(d.why).replaceAll('-', ' ')}`),
  received: (d, e) =>
    join(
      `From ${e.actor.label}`,
      d.thumbprint ? `key ${short(d.thumbprint)}` : 'plain bearer',
      clockWords(d.clockOffsetMs),
    ),
  'bytes-quarantined': (d) =>
    `${text((d.arrived as Record<string, unknown> | undefined)?.bytes)} bytes arrived that are not the announced ones; kept in quarantine, never in the record`,
  sealed: (d) =>
    join(
      `${text(d.bytes)} bytes`,
      `SHA-256 ${short(d.sha256)}`,
      d.lockedUntil ? `locked until ${day(d.lockedUntil)}` : 'the store has no lock',
    ),
  measured: (d) => {
    const told = (Array.isArray(d.findings) ? (d.findings as { code: string; severity: string }[]) : [])
      .filter((f) => f.severity !== 'note')
      .map((f) => f.code.replaceAll('-', ' '));
    return `Verdict “${VERDICTS[text(d.verdict)] ?? text(d.verdict)}” under policy ${text(d.policy)}${told.length > 0 ? `: ${told.join(', ')}` : ''}`;
  },
  filed: (d, e) =>
    `To encounter ${text(d.encounter)} ${d.by === 'session' ? `by listening session ${text(d.session)}` : d.by === 'identifier' ? 'by the scanned identifier' : `by ${actorWords(e.actor)}`}`,
  'filing-superseded': (d, e) =>
    `From ${text(d.from)} to ${text(d.to)} by ${actorWords(e.actor)}. Reason given: “${text(d.reason)}”`,
  'put-in-tray': (d) => `Because ${TRAY_WORDS[text(d.why)] ?? text(d.why)}`,
  'kept-anyway': (d, e) => `${actorWords(e.actor)}. Reason given: “${text(d.reason)}”`,
  heard: (d, e) =>
    join(
      actorWords(e.actor),
      text(d.band),
      typeof d.from === 'number' && typeof d.to === 'number' && `${text(d.from)} to ${text(d.to)} s`,
      typeof d.seconds === 'number' && `for ${text(d.seconds)} s`,
    ),
  exported: (d, e) =>
    join(actorWords(e.actor), d.what === 'evidence' && `evidence package. Reason given: “${text(d.reason)}”`),
  'evidence-asked': (d, e) =>
    `${actorWords(e.actor)}. Reason given: “${text(d.reason)}”${d.secondPerson === true ? '. A second person decides' : ''}`,
  'evidence-decided': (d, e) => `${text(d.decision)} by ${actorWords(e.actor)}`,
  downloaded: (d, e) => join(actorWords(e.actor), d.why === 'verification' && 'to hash it in the browser'),
  'access-outside-wards': (d, e) => `${actorWords(e.actor)}. Reason given: “${text(d.reason)}”`,
  'session-opened': (d, e) =>
    join(
      `${text(d.number)} by ${actorWords(e.actor)}`,
      d.assetTag ? `with ${text(d.assetTag)}` : false,
      d.encounter ? `for ${text(d.encounter)}` : false,
    ),
  'session-closed': (d, e) =>
    join(`${text(d.number)} by ${actorWords(e.actor)}`, text(d.why).replaceAll('-', ' ')),
  'device-enrolled': (d) =>
    join(`Serial ${text(d.serialNumber)}`, `key ${short(d.thumbprint)}`, text(d.keyType)),
  'device-state-changed': (d, e) =>
    join(
      `${text(e.before?.state)} to ${text(e.after?.state)} by ${actorWords(e.actor)}`,
      d.reason ? `reason: “${text(d.reason)}”` : false,
    ),
  'device-firmware-changed': (_d, e) =>
    `${text(e.before?.firmware) || 'unknown'} to ${text(e.after?.firmware)}`,
  'enrolment-code-issued': (d, e) =>
    join(`By ${actorWords(e.actor)}`, `ends ${text(d.expiresAt).slice(0, 16).replace('T', ' ')} UTC`),
  'enrolment-code-refused': (d) => join(text(d.why), `${text(d.triesLeft)} tries left`),
  'credential-issued': (d) =>
    join(text(d.label), d.bound ? 'bound to the device’s key' : 'plain bearer', `ends ${day(d.expiresAt)}`),
  'credential-renewed': (d) =>
    join(
      `${text(d.from)} to ${text(d.to)}`,
      `old one works until ${text(d.overlapEndsAt).slice(0, 16).replace('T', ' ')} UTC at the latest`,
    ),
  'credential-renewal-asked': (d, e) => `${text(d.label)} by ${actorWords(e.actor)}`,
  'credential-first-used': (d) => text(d.label),
  'credential-retired': (d) => join(text(d.label), text(d.why)),
  'credential-quarantined': (d) => join(text(d.label), text(d.why)),
  'signing-key-distrusted': (d, e) =>
    join(
      `by ${actorWords(e.actor)}`,
      `${text(d.renewing)} renew by their own keys`,
      d.reason ? `reason: “${text(d.reason)}”` : false,
    ),
  'rotation-started': (d, e) =>
    join(text(d.label), `${text(d.members)} credentials`, `by ${actorWords(e.actor)}`),
  'rotation-ended': (d) =>
    join(text(d.label), `${text(d.done ?? 0)} renewed`, d.missed ? `${text(d.missed)} missed` : false),
  'device-lost': (d, e) =>
    join(`by ${actorWords(e.actor)}`, d.reason ? `reason: “${text(d.reason)}”` : false),
  'credential-revoked': (d, e) =>
    join(text(d.label), `by ${actorWords(e.actor)}`, d.why ? `reason: “${text(d.why)}”` : false),
  'person-invited': (d, e) =>
    join(
      `${text(d.name)} as ${roleList(d.roles)} by ${actorWords(e.actor)}`,
      d.again === true && 'sent again',
    ),
  'invitation-withdrawn': (d, e) => `${text(d.name)} by ${actorWords(e.actor)}`,
  'person-joined': (_d, e) => `${e.actor.label} as ${roleList(e.after?.roles)}`,
  'role-given': (d, e) => `${roleList([d.role])} to ${text(d.name)} by ${actorWords(e.actor)}`,
  'role-taken': (d, e) => `${roleList([d.role])} from ${text(d.name)} by ${actorWords(e.actor)}`,
  'wards-changed': (_d, e) =>
    `${plainList(e.before?.wards)} to ${plainList(e.after?.wards)} by ${actorWords(e.actor)}`,
  'person-left': (d, e) =>
    `${text(d.name)}, said by ${actorWords(e.actor)}. Reason given: “${text(d.reason)}”`,
  'signed-in': (d, e) => join(e.actor.label, d.secondFactor ? `with ${text(d.secondFactor)}` : false),
  'sign-in-refused': (d) => (d.factor ? `Wrong ${text(d.factor)}` : 'Wrong password'),
  'sessions-ended': (d, e) => `${text(d.count)} by ${actorWords(e.actor)}`,
  'second-factor-removed': (d, e) =>
    join(`By ${actorWords(e.actor)}`, d.reason ? `reason: “${text(d.reason)}”` : false),
  'password-reset': (d, e) => `${e.actor.label}, ${text(d.how)}`,
  'policy-changed': (d, e) =>
    join(
      `${text(d.policy)}, version ${text(d.version)}, by ${actorWords(e.actor)}: ${changeWords(e)}`,
      d.reason ? `reason: “${text(d.reason)}”` : false,
    ),
  'connection-changed': (d, e) =>
    join(`${text(d.connection)} by ${actorWords(e.actor)}`, d.reason ? `reason: “${text(d.reason)}”` : false),
  'connection-tested': (d, e) =>
    join(
      `${text(d.connection)} by ${actorWords(e.actor)}`,
      d.ok === true ? 'it works' : `failed at ${text(d.failed)}: ${text(d.why)}`,
    ),
  'passkey-added': (d, e) => join(text(d.name), `by ${actorWords(e.actor)}`),
  'passkey-removed': (d, e) => join(text(d.name), `by ${actorWords(e.actor)}`),
  'sign-on-linked': (d, e) => `${e.actor.label} at ${text(d.issuer)}`,
  'client-created': (d, e) => join(text(d.name), plainList(d.scopes), `by ${actorWords(e.actor)}`),
  'client-rotated': (d, e) => join(text(d.name), `by ${actorWords(e.actor)}`),
  'client-revoked': (d, e) =>
    join(text(d.name), `by ${actorWords(e.actor)}`, d.reason ? `reason: “${text(d.reason)}”` : false),
  'webhook-added': (d, e) => join(text(d.name), plainList(d.events), `by ${actorWords(e.actor)}`),
  'webhook-changed': (d, e) => join(text(d.name), text(d.change), `by ${actorWords(e.actor)}`),
  'webhook-removed': (d, e) => join(text(d.name), `by ${actorWords(e.actor)}`),
  'delivery-repeated': (d, e) => join(text(d.type), `by ${actorWords(e.actor)}`),
  'credential-misused': (d, e) => `By ${e.actor.label} or whoever holds its key: ${text(d.why)}`,
};

/** An entry as a title, a sentence and a tone. */
export function wordedEntry(entry: EntryLike): WordedEntry {
  const title = TITLES[entry.kind] ?? entry.kind.replaceAll('-', ' ');
  const sentence = SENTENCES[entry.kind]?.(entry.detail ?? {}, entry) || actorWords(entry.actor);
  return {
    title,
    sentence,
    tone: ALARMS.has(entry.kind) ? 'alarm' : ACCESSES.has(entry.kind) ? 'access' : 'plain',
  };
}

/** Kinds by the words people choose them by, for the ledger's filter. */
export const KIND_CHOICES = Object.entries(TITLES)
  .map(([value, label]) => ({ value, label }))
  .sort((a, b) => a.label.localeCompare(b.label));
