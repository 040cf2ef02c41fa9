import { EmptyState } from '../../widgets/states.tsx';
import { en } from '../../texts/en.ts';

/** Fly: not built yet; says so. */
export default function Fly() {
  return <EmptyState title={en.aims.fly}>This place is not built yet.</EmptyState>;
}
