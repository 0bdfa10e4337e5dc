'use client';

import { useState } from 'react';
import { cx } from '@/components/ui/cx';
import { SITES, type SiteId } from '@/lib/contract/sites';
import { BodyOutline } from './bodyOutline';

export type SiteState = 'todo' | 'done' | 'repeat';
type View = 'front' | 'back';
type Site = (typeof SITES)[number];

export interface BodyMapProps {
  /** State by site; a site that is missing is still to do. */
  states: Partial<Record<SiteId, SiteState>>;
  /** Where the chestpiece goes next: ringed. */
  next?: SiteId | null;
  selected?: SiteId | null;
  /** Sites are buttons when it is given, else only a picture with a list behind it. */
  onSelect?: (site: SiteId) => void;
  /** Leave the counts under the map out. */
  withoutLegend?: boolean;
}

const STATE_WORDS: Record<SiteState, string> = { todo: 'to do', done: 'done', repeat: 'record again' };
const VIEWS: readonly { view: View; name: string; sides: readonly [string, string] }[] = [
  // Seen from behind, the patient's left is on the reader's left; from the front it is the other way round.
  { view: 'back', name: 'Back', sides: ['left', 'right'] },
  { view: 'front', name: 'Front', sides: ['right', 'left'] },
];

/** Where to listen: back and front side by side; on a phone one at a time, so that a site stays 44 px wide. */
export function BodyMap(props: BodyMapProps) {
  const { next, selected } = props;
  const wanted = SITES.find((site) => site.id === (next ?? selected))?.view ?? 'back';
  const [turned, setTurned] = useState<{ from: View; to: View } | null>(null);
  // A turn by hand holds until the map has a reason to turn by itself.
  const shown = turned && turned.from === wanted ? turned.to : wanted;
  return (
    <div className="grid gap-4">
      <fieldset className="flex min-[641px]:hidden">
        <legend className="sr-only">Side of the body</legend>
        {VIEWS.map(({ view, name }) => (
          <button
            key={view}
            type="button"
            aria-pressed={view === shown}
            onClick={() => setTurned({ from: wanted, to: view })}
            className={cx(
              'min-h-11 flex-1 border border-line-control',
              view === shown ? 'bg-sheet font-bold' : 'text-ink-soft',
              view === 'back' ? 'rounded-l-plate' : 'rounded-r-plate border-l-0',
            )}
          >
            {name} {leftToDo(view, props.states)}
          </button>
        ))}
      </fieldset>
      <div className="grid gap-2 min-[641px]:grid-cols-2">
        {VIEWS.map((one) => (
          <BodyView key={one.view} {...one} {...props} hidden={one.view !== shown} />
        ))}
      </div>
      {props.withoutLegend ? null : <Legend states={props.states} />}
    </div>
  );
}

const leftToDo = (view: View, states: BodyMapProps['states']) => {
  const left = SITES.filter((site) => site.view === view && stateOf(site, states) !== 'done').length;
  return left === 0 ? '' : `(${left} to do)`;
};
const stateOf = (site: Site, states: BodyMapProps['states']): SiteState => states[site.id] ?? 'todo';

function BodyView({
  view,
  name,
  sides,
  hidden,
  states,
  next,
  selected,
  onSelect,
}: BodyMapProps & (typeof VIEWS)[number] & { hidden: boolean }) {
  return (
    <figure className={cx('relative', hidden && 'max-[640px]:hidden')}>
      <div aria-hidden="true" className="flex justify-between px-4 font-semibold text-ink-soft">
        <span>{sides[0]}</span>
        <span>{sides[1]}</span>
      </div>
      <div className="relative">
        <BodyOutline view={view} />
        <ul>
          {SITES.filter((site) => site.view === view).map((site) => (
            <li key={site.id} className="contents">
              <SiteMark
                site={site}
                state={stateOf(site, states)}
                isNext={site.id === next}
                selected={site.id === selected}
                onSelect={onSelect}
              />
            </li>
          ))}
        </ul>
      </div>
      <figcaption className="text-center text-13 text-ink-soft">{name}</figcaption>
    </figure>
  );
}

interface SiteMarkProps {
  site: Site;
  state: SiteState;
  isNext: boolean;
  selected: boolean;
  onSelect?: (site: SiteId) => void;
}

function SiteMark({ site, state, isNext, selected, onSelect }: SiteMarkProps) {
  const words = `Site ${site.number}, ${site.label}: ${STATE_WORDS[state]}${isNext ? ', next' : ''}`;
  const place = { left: `${site.x}%`, top: `${site.y}%` };
  const shape = cx(
    'absolute grid size-12 -translate-x-1/2 -translate-y-1/2 place-items-center rounded-full',
    isNext && 'bg-brass-wash',
  );
  const drawing = (
    <SiteShape number={site.number} state={state} ringed={isNext || selected} selected={selected} />
  );
  if (!onSelect)
    return (
      <span role="img" aria-label={words} style={place} className={shape}>
        {drawing}
      </span>
    );
  return (
    <button
      type="button"
      aria-label={words}
      aria-pressed={selected}
      title={words}
      onClick={() => onSelect(site.id)}
      style={place}
      className={shape}
    >
      {drawing}
    </button>
  );
}

interface SiteShapeProps {
  number?: number;
  state: SiteState;
  ringed?: boolean;
  selected?: boolean;
}

function SiteShape({ number, state, ringed = false, selected = false }: SiteShapeProps) {
  return (
    <svg aria-hidden="true" viewBox="0 0 48 48" className="size-full overflow-visible">
      {ringed ? (
        <circle
          cx="24"
          cy="24"
          r="25.5"
          fill="none"
          strokeWidth="2"
          className={selected ? 'stroke-ink' : 'stroke-brass'}
        />
      ) : null}
      {state === 'done' ? <circle cx="24" cy="24" r="21" className="fill-spruce" /> : null}
      {state === 'todo' ? (
        <circle
          cx="24"
          cy="24"
          r="20.5"
          strokeWidth="1.8"
          strokeDasharray="4 4"
          vectorEffect="non-scaling-stroke"
          className="fill-sheet stroke-ink-soft"
        />
      ) : null}
      {state === 'repeat' ? (
        <>
          <circle cx="24" cy="24" r="20" className="fill-rust-wash" />
          <path d="M38.1 9.9A20 20 0 1 0 44 24" fill="none" strokeWidth="4" className="stroke-rust" />
        </>
      ) : null}
      {number === undefined ? null : (
        <text
          x="24"
          y="24"
          textAnchor="middle"
          dominantBaseline="central"
          className={cx(
            'text-17 font-bold',
            state === 'done' ? 'fill-on-spruce' : state === 'repeat' ? 'fill-rust' : 'fill-ink',
          )}
        >
          {number}
        </text>
      )}
    </svg>
  );
}

function Legend({ states }: { states: BodyMapProps['states'] }) {
  return (
    <ul className="flex flex-wrap gap-x-[22px] gap-y-2">
      {(['done', 'repeat', 'todo'] as const).map((state) => (
        <li key={state} className="inline-flex items-center gap-2">
          <span className="size-6">
            <SiteShape state={state} />
          </span>
          {STATE_WORDS[state]} {SITES.filter((site) => stateOf(site, states) === state).length}
        </li>
      ))}
    </ul>
  );
}
