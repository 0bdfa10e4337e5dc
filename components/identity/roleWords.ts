import { ROLE_NAMES, ROLES, type Role } from '@/lib/identity/permissions';

export const ROLE_HELP: Record<Role, string> = {
  biomed: 'Looks after the devices: the Bench.',
  clinician: 'Records, files and listens for the patients of their wards: the Bedside.',
  itadmin: 'Credentials, people, connections: the Key room. Needs a second factor.',
  auditor: 'Reads everything that happened, changes nothing: the Ledger.',
};

export const roleWords = (roles: readonly Role[]): string =>
  ROLES.filter((role) => roles.includes(role))
    .map((role) => ROLE_NAMES[role])
    .join(', ');

const BROWSERS: [RegExp, string][] = [
  [/Edg\//, 'Edge'],
  [/OPR\//, 'Opera'],
  [/Firefox\//, 'Firefox'],
  [/Chrom(?:e|ium)\//, 'Chrome'],
  [/Safari\//, 'Safari'],
];
const SYSTEMS: [RegExp, string][] = [
  [/Windows/, 'Windows'],
  [/iPad/, 'iPad'],
  [/iPhone/, 'iPhone'],
  [/Android/, 'Android'],
  [/Mac OS X/, 'macOS'],
  [/CrOS/, 'ChromeOS'],
  [/Linux/, 'Linux'],
];

/** What a browser says of itself, as people would: "Firefox on Windows". It is its own word, and proves nothing. */
export function programWords(userAgent: string | null): string {
  const name = (list: [RegExp, string][]) => list.find(([shape]) => shape.test(userAgent ?? ''))?.[1];
  const [browser, system] = [name(BROWSERS), name(SYSTEMS)];
  if (browser && system) return `${browser} on ${system}`;
  return browser ?? system ?? 'Unknown program';
}

/** An address as it is written: IPv6 in its short form (RFC 5952), and of that only the network is kept. */
export function addressWords(address: string | null): string {
  if (!address?.includes(':')) return address ?? 'unknown';
  try {
    return new URL(`http://[${address}]`).hostname.slice(1, -1);
  } catch {
    return address;
  }
}
