'use client';

import { useFormStatus } from 'react-dom';
import { Button, type ButtonProps } from './Button';

/** The submit of a form with a server action: busy while the action runs. Its words say what it will do. */
export function SubmitButton({ variant = 'primary', ...rest }: Omit<ButtonProps, 'type' | 'busy'>) {
  const { pending } = useFormStatus();
  return <Button type="submit" variant={variant} busy={pending} {...rest} />;
}
