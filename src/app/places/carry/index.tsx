import { EmptyState } from '../../widgets/states.tsx';
import { en } from '../../texts/en.ts';

/** Carry: not built yet; says so. */
export default function Carry() {
  return <EmptyState title={en.aims.carry}>This place is not built yet.</EmptyState>;
}
