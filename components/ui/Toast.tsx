'use client';

import { Toaster, toast } from 'sonner';

/** Where passing words turn up. One in the shell. */
export function ToastRegion() {
  return (
    <Toaster
      position="bottom-right"
      mobileOffset={{ bottom: 80 }}
      duration={6000}
      toastOptions={{
        unstyled: true,
        classNames: {
          toast:
            'w-full flex items-center gap-3 rounded-plate border border-line bg-sheet px-4 py-3 text-15 text-ink shadow-raised font-text',
          title: 'font-semibold',
          description: 'text-ink-soft',
          actionButton: 'ml-auto font-semibold text-spruce underline underline-offset-3',
          error: 'border-l-[6px] border-l-rust',
          success: 'border-l-[6px] border-l-spruce',
        },
      }}
    />
  );
}

/** Something was done. Never the only place where it is said. */
export const tell = (message: string, description?: string) => toast.success(message, { description });
