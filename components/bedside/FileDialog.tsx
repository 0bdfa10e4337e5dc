'use client';

import { useState } from 'react';
import { Dialog } from '@/components/ui/Dialog';
import { tell } from '@/components/ui/Toast';
import { type EncounterChoice, EncounterPicker } from './EncounterPicker';
import { IdentifiersForm } from './IdentifiersForm';
import { nameOf } from './words';

interface Props {
  /** The recording's number. */
  number: string;
  /** Where it is to be filed; without, an encounter is searched for first. */
  to?: EncounterChoice | null;
  /** Moving: where it is filed now, and the version of the recording that is shown. */
  from?: { encounter: string; version: number } | undefined;
  open: boolean;
  onOpenChange: (open: boolean) => void;
  /** Filed, or found to be filed by somebody else: what is shown is asked for again. */
  onDone: () => void;
}

/** File a clip, or move one: choose the encounter, read two identifiers, and for a move say why. */
export function FileDialog({ number, to = null, from, open, onOpenChange, onDone }: Props) {
  const [picked, setPicked] = useState<EncounterChoice | null>(null);
  const target = to ?? picked;
  const verb = from ? 'Move' : 'File';
  const where = target ? ` to ${target.number}` : '';
  return (
    <Dialog
      open={open}
      onOpenChange={(now) => {
        if (!now) setPicked(null);
        onOpenChange(now);
      }}
      wide={!to}
      title={`${verb} ${number}${where}`}
      description={
        from
          ? `It is filed to ${from.encounter}. That filing stays readable in the custody thread.`
          : to
            ? `${nameOf(to)}${to.ward ? `, ${to.ward}` : ''}. Two identifiers are read before a clip is filed.`
            : 'It is in the tray. Choose the encounter it belongs to, then read two identifiers.'
      }
    >
      <div className="grid gap-5">
        {to ? null : (
          <EncounterPicker chosen={picked} onChoose={setPicked} without={from?.encounter ?? null} />
        )}
        {target ? (
          <IdentifiersForm
            key={target.id}
            url={`/api/recordings/${number}/${from ? 'move' : 'file'}`}
            encounterId={target.id}
            version={from?.version}
            submitLabel={`${verb} to ${target.number}`}
            onOutdated={onDone}
            onDone={() => {
              tell(`${number} is filed to ${target.number}`);
              setPicked(null);
              onOpenChange(false);
              onDone();
            }}
          />
        ) : null}
      </div>
    </Dialog>
  );
}
