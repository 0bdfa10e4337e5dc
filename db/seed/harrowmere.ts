import type { ModelDescription } from '@/lib/fleet/describeModel';
import type { Role } from '@/lib/identity/permissions';

/** Harrowmere General Hospital: invented, every person and number of it. */
export const WARDS = ['Alder', 'Birch', 'Cedar', 'Rowan', 'Emergency department', 'Stores'] as const;
export type WardName = (typeof WARDS)[number];

export interface SeedPerson {
  name: string;
  email: string;
  jobTitle: string;
  roles: Role[];
  wards: WardName[];
}

export const PEOPLE: SeedPerson[] = [
  {
    name: 'Ines Okafor-Lindqvist',
    email: 'ines@harrowmere.example',
    jobTitle: 'Biomedical engineering',
    roles: ['biomed'],
    wards: [],
  },
  {
    name: 'Dr Solveig Adeyemi',
    email: 'solveig@harrowmere.example',
    jobTitle: 'Respiratory medicine',
    roles: ['clinician'],
    wards: ['Alder', 'Birch'],
  },
  {
    name: 'Dr Pascal Ngata',
    email: 'pascal@harrowmere.example',
    jobTitle: 'Respiratory medicine',
    roles: ['clinician'],
    wards: ['Alder', 'Cedar'],
  },
  {
    name: 'Sister Imelda Croft',
    email: 'imelda@harrowmere.example',
    jobTitle: 'Emergency nursing',
    roles: ['clinician'],
    wards: ['Emergency department', 'Rowan'],
  },
  {
    name: 'Tomasz Abara',
    email: 'tomasz@harrowmere.example',
    jobTitle: 'Information technology',
    roles: ['itadmin'],
    wards: [],
  },
  {
    name: 'Marguerite Osei',
    email: 'marguerite@harrowmere.example',
    jobTitle: 'Clinical governance',
    roles: ['auditor'],
    wards: [],
  },
];

export const MODELS: ModelDescription[] = [
  {
    maker: 'Tarn & Wick',
    name: 'Tarn & Wick TW-2',
    sampleRatesHz: [4000],
    bitDepths: [16],
    mediaTypes: ['audio/wav'],
    allowLossy: false,
    longestClipSeconds: 120,
    fullScaleNote: 'Clips hard at full scale; gain in seven steps.',
    checkIntervalDays: 180,
    signsRequests: true,
  },
  {
    maker: 'Ossel',
    name: 'Ossel Clarity 4',
    sampleRatesHz: [8000, 44_100],
    bitDepths: [16, 24],
    mediaTypes: ['audio/wav', 'audio/flac'],
    allowLossy: false,
    longestClipSeconds: 300,
    fullScaleNote: 'Limits 3 dB below full scale before its converter.',
    checkIntervalDays: 90,
    signsRequests: true,
  },
  {
    maker: 'Marrow',
    name: 'Marrow Field 1',
    sampleRatesHz: [4000, 8000],
    bitDepths: [16],
    mediaTypes: ['audio/wav'],
    allowLossy: false,
    longestClipSeconds: 60,
    fullScaleNote: null,
    checkIntervalDays: 365,
    signsRequests: false,
  },
];

export interface SeedDevice {
  assetTag: string;
  serialNumber: string;
  model: string;
  ward: WardName;
  firmware: string;
  /** Months ago it came; fractions allowed. null: still waiting for its enrolment. */
  enrolledDaysAgo: number | null;
  state: 'in-service' | 'quarantined' | 'in-repair' | 'waiting';
  stateReason?: string;
  /** Sensitivity it loses, dB over the sixty days, and noise it gains. */
  drift: 'none' | 'deaf' | 'noisy';
}

const GIVEN = [
  'Aurelio',
  'Benedikta',
  'Casimir',
  'Delphine',
  'Emeka',
  'Freya',
  'Gustavo',
  'Hanneke',
  'Ibrahim',
  'Jocasta',
  'Kwabena',
  'Liesel',
  'Mirembe',
  'Niamh',
  'Oluwaseun',
  'Petronella',
  'Quentin',
  'Rosalind',
  'Siobhan',
  'Tadeusz',
  'Ursula',
  'Valentin',
  'Wilhelmina',
  'Xanthe',
  'Yusuf',
  'Zofia',
  'Anselm',
  'Birgit',
  'Cormac',
  'Dorothea',
  'Eilidh',
  'Florian',
] as const;
const FAMILY = [
  'Mbeki-Tran',
  'Ashgrove',
  'Bellamy-Ruiz',
  'Castellane',
  'Drummond',
  'Eriksen',
  'Fairweather',
  'Gorecki',
  'Hollis',
  'Ivarsson',
  'Jankowska',
  'Kettleby',
  'Lindgren',
  'Montague',
  'Nwosu',
  'O’Dwyer',
  'Pemberton',
  'Quayle',
  'Rasmussen',
  'Sorrento',
  'Thackeray',
  'Underhill',
  'Vasquez',
  'Whitlock',
  'Xu',
  'Yardley',
  'Zeller',
  'Abernathy',
  'Brandt',
  'Callender',
  'Dunmore',
  'Featherstonehaugh-Cholmondeley',
] as const;

export { FAMILY, GIVEN };

const hexDigits = '0123456789ABCDEF';

/** Sixty devices of three models: two drifting, one gone quiet, one in repair, two quarantined, five still waiting. */
export function seedDevices(random: {
  whole(low: number, high: number): number;
  pick<T>(from: readonly T[]): T;
}): SeedDevice[] {
  const wards: WardName[] = ['Alder', 'Birch', 'Cedar', 'Rowan', 'Emergency department'];
  return Array.from({ length: 60 }, (_, i) => {
    const kind = i % 3;
    const serialNumber =
      kind === 0
        ? `TW2-${[0, 1, 2, 3].map(() => random.pick([...'0123456789ABCDEFGHJKMNPQRSTVWXYZ'])).join('')}-${[0, 1, 2, 3].map(() => hexDigits[random.whole(0, 15)]).join('')}`
        : kind === 1
          ? `OC4-55${String(1000 + i * 37).padStart(4, '0')}`
          : `MF1-A-${String(180 + i).padStart(5, '0')}`;
    const waiting = i >= 55;
    return {
      assetTag: `HM-${String(301 + i * 4).padStart(4, '0')}`,
      serialNumber,
      model: MODELS[kind]?.name ?? '',
      ward: waiting ? 'Stores' : (wards[i % wards.length] ?? 'Alder'),
      firmware: kind === 0 ? (i % 2 ? '2.4.1' : '2.4.0') : kind === 1 ? '4.1.7' : '1.0.9',
      enrolledDaysAgo: waiting ? null : kind === 2 ? random.whole(1, 8) : random.whole(5, 84),
      state: waiting
        ? 'waiting'
        : i === 13 || i === 28
          ? 'quarantined'
          : i === 21
            ? 'in-repair'
            : 'in-service',
      ...(i === 13
        ? { stateReason: 'Noise floor rose 14 dB in three weeks; to be checked at the bench' }
        : {}),
      ...(i === 28 ? { stateReason: 'Diaphragm rim cracked, reported by ward' } : {}),
      ...(i === 21 ? { stateReason: 'Battery swelling; sent to the maker' } : {}),
      drift: i === 13 || i === 33 ? 'noisy' : i === 6 ? 'deaf' : 'none',
    };
  });
}
