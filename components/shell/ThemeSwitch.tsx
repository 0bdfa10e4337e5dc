'use client';

import { useRef, useState } from 'react';
import { cx } from '@/components/ui/cx';
import { THEME_COOKIE, THEMES, type Theme } from './theme';

const NAMES: Record<Theme, string> = { day: 'Day', night: 'Night', system: 'System' };
const YEAR_SECONDS = 31_536_000;

/** Day, night or as the system says: at once here, and from the server at the next page. */
export function ThemeSwitch({ theme }: { theme: Theme }) {
  const [chosen, setChosen] = useState(theme);
  const group = useRef<HTMLFieldSetElement>(null);
  const choose = (next: Theme) => {
    setChosen(next);
    const root = document.documentElement;
    if (next === 'system') delete root.dataset.theme;
    else root.dataset.theme = next;
    const secure = location.protocol === 'https:' ? '; secure' : '';
    // biome-ignore lint/suspicious/noDocumentCookie: the Cookie Store API is not in every browser of a hospital
    document.cookie = `${THEME_COOKIE}=${next}; path=/; max-age=${YEAR_SECONDS}; samesite=lax${secure}`;
  };
  return (
    <fieldset ref={group} className="flex">
      <legend className="sr-only">Day or night</legend>
      {THEMES.map((one) => (
        <button
          key={one}
          type="button"
          aria-pressed={chosen === one}
          onClick={() => choose(one)}
          className={cx(
            'min-h-8 flex-1 border border-l-0 border-line-control px-1.5 text-13 first-of-type:rounded-l-plate first-of-type:border-l last-of-type:rounded-r-plate',
            chosen === one ? 'bg-sheet font-bold text-ink' : 'text-ink-soft hover:text-ink',
          )}
        >
          {NAMES[one]}
        </button>
      ))}
    </fieldset>
  );
}
