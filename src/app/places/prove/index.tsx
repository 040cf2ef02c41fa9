import { EmptyState } from '../../widgets/states.tsx';
import { en } from '../../texts/en.ts';

/** Prove: not built yet; says so. */
export default function Prove() {
  return <EmptyState title={en.aims.prove}>This place is not built yet.</EmptyState>;
}
