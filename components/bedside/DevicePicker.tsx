'use client';

import { useId } from 'react';
import useSWR from 'swr';
import { getJson } from '@/components/shell/useData';
import { cx } from '@/components/ui/cx';
import { Field, TextInput } from '@/components/ui/Field';
import { Time } from '@/components/ui/Time';

/** A stethoscope to choose. */
export interface DeviceChoice {
  id: string;
  assetTag: string;
  serialNumber: string;
  model: string;
  lastHeardAt: number | null;
  batteryPercent: number | null;
  checkDueAt: number | null;
  /** Number of the listening session that it is in. */
  inSession: string | null;
}

interface Props {
  /** What stands in the field: scanned, typed or chosen. */
  word: string;
  onWord: (word: string) => void;
  /** Those of the person's wards. */
  own: readonly DeviceChoice[];
  error?: string | undefined;
}

/** A scanner types the label into the field; a finger chooses from the list under it, which the field narrows. */
export function DevicePicker({ word, onWord, own, error }: Props) {
  const name = useId();
  const wanted = word.trim();
  const chosen = own.some(({ assetTag }) => assetTag === wanted);
  const { data } = useSWR<{ results: DeviceChoice[] }>(
    wanted === '' || chosen ? null : `/api/devices/pick?q=${encodeURIComponent(wanted)}`,
    getJson,
    { keepPreviousData: true },
  );
  const rows = wanted === '' || chosen ? own : (data?.results ?? own);
  return (
    <div className="grid gap-3">
      <Field
        label="Stethoscope"
        help="Scan its label, or type the asset tag or serial number."
        error={error}
        required
      >
        <TextInput
          value={word}
          onChange={(event) => onWord(event.target.value)}
          mono
          autoComplete="off"
          autoCapitalize="characters"
          spellCheck={false}
          className="min-h-11"
        />
      </Field>
      <ul
        aria-label="Stethoscopes"
        className="grid rounded-plate border border-line bg-sheet empty:hidden min-[641px]:grid-cols-2"
      >
        {rows.map((one) => (
          <li key={one.id}>
            <label
              className={cx(
                'flex min-h-[52px] cursor-pointer items-center gap-3 px-4 py-2 hover:bg-spruce-wash',
                one.assetTag === wanted && 'bg-spruce-wash',
              )}
            >
              <input
                type="radio"
                name={name}
                checked={one.assetTag === wanted}
                onChange={() => onWord(one.assetTag)}
                className="size-[17px] flex-none"
              />
              <span className="min-w-0">
                <span className="block">
                  <b className="mono">{one.assetTag}</b> {one.model}
                </span>
                <span className="text-13 text-ink-soft">
                  <State device={one} />
                </span>
              </span>
            </label>
          </li>
        ))}
      </ul>
    </div>
  );
}

function State({ device }: { device: DeviceChoice }) {
  if (device.inSession) return <>in session {device.inSession}</>;
  return (
    <>
      heard <Time at={device.lastHeardAt} ago />
      {device.batteryPercent === null ? '' : `, battery ${device.batteryPercent} %`}
    </>
  );
}
