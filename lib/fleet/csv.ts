import { stringify } from 'csv-stringify/sync';
import type { FleetLine } from './readFleet';

/**
 * A cell that a spreadsheet would take for a formula is quoted with an apostrophe (OWASP, CSV Injection, from memory):
 * also behind spaces, and in full width, which some programs read as the plain sign.
 */
export const inertCell = (value: string): string =>
  /^\s*[=+\-@＝＋－＠]|^[\t\r\n]/.test(value) ? `'${value}` : value;

const iso = (at: number | null): string => (at === null ? '' : new Date(at).toISOString());

/** The fleet as CSV (RFC 4180), with a header line. */
export function fleetCsv(rows: readonly FleetLine[]): string {
  const header = [
    'asset tag',
    'serial number',
    'udi',
    'model',
    'ward',
    'firmware',
    'state',
    'last heard (UTC)',
    'check due (UTC)',
    'credential ends (UTC)',
    'latest recording',
    'latest verdict',
  ];
  const cells = rows.map((row) =>
    [
      row.assetTag,
      row.serialNumber,
      row.udi ?? '',
      row.model,
      row.ward ?? '',
      row.firmware ?? '',
      row.state,
      iso(row.lastHeardAt),
      iso(row.checkDueAt),
      iso(row.credentialEndsAt),
      row.latest?.number ?? '',
      row.latest?.verdict ?? '',
    ].map(inertCell),
  );
  return stringify([header, ...cells], { record_delimiter: 'windows' });
}
