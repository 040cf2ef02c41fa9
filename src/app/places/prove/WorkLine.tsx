/** The run under way: share done, time left, hold, stop. */
import { Button } from '../../widgets/Button.tsx';
import { ProgressLine } from '../../widgets/ProgressLine.tsx';
import type { WorkKind } from './runs.ts';
import { useDesk } from './shared.ts';
import { proveTexts as words } from './texts.ts';

export function WorkLine(props: { kind: WorkKind; label: string }) {
  const { runs } = useDesk();
  const work = runs.work.value;
  if (work === null || work.kind !== props.kind) return null;
  const { progress, paused } = work;
  const left = progress?.left_s == null || paused !== false ? '' : words.seconds(progress.left_s);
  return (
    <div class="prove-work">
      <ProgressLine share={progress === null ? null : progress.done / progress.count} label={props.label} />
      <span class="faint">
        {progress !== null && words.left(progress.done, progress.count, left)}
        {paused !== false && ` ${words.held[paused]}`}
      </span>
      <Button onClick={() => runs.togglePause()}>{paused === false ? words.pause : words.resume}</Button>
      <Button onClick={() => runs.cancel()}>{words.stop}</Button>
    </div>
  );
}
