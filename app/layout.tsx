import type { Metadata, Viewport } from 'next';
import { cookies } from 'next/headers';
import type { ReactNode } from 'react';
import { THEME_COOKIE, themeOf } from '@/components/shell/theme';
import './globals.css';

export const metadata: Metadata = {
  title: { default: 'Bellkeep', template: '%s · Bellkeep' },
  description:
    'Takes in stethoscope recordings, judges whether each is technically usable, files it and proves its custody.',
  robots: { index: false, follow: false },
};

export const viewport: Viewport = {
  width: 'device-width',
  initialScale: 1,
  colorScheme: 'light dark',
  themeColor: [
    { media: '(prefers-color-scheme: light)', color: '#efeadf' },
    { media: '(prefers-color-scheme: dark)', color: '#0b100f' },
  ],
};

export default async function RootLayout({ children }: { children: ReactNode }) {
  const theme = themeOf((await cookies()).get(THEME_COOKIE)?.value);
  // The attribute is the person's own and changes in place: what the server wrote is only the first value.
  return (
    <html lang="en" data-theme={theme === 'system' ? undefined : theme} suppressHydrationWarning>
      <body>{children}</body>
    </html>
  );
}
