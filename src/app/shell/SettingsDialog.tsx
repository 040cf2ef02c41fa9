import { useStore } from '../store/context.ts';
import { THEMES, UNIT_SYSTEMS } from '../store/document.ts';
import { Dialog } from '../widgets/Dialog.tsx';
import { Select } from '../widgets/Select.tsx';

export default function SettingsDialog(props: { onClose: () => void }) {
  const store = useStore();
  const words = store.texts.settings;
  const now = store.settings.value;
  return (
    <Dialog title={words.title} onClose={props.onClose}>
      <Select
        label={words.theme}
        value={now.theme}
        options={THEMES.map((value) => ({ value, label: words.themes[value] }))}
        onChange={(theme) => store.changeSettings({ theme })}
      />
      <Select
        label={words.units}
        value={now.units}
        options={UNIT_SYSTEMS.map((value) => ({ value, label: words.unitSystems[value] }))}
        onChange={(units) => store.changeSettings({ units })}
      />
      <Select
        label={words.motion}
        value={now.reducedMotion}
        options={(['auto', 'on'] as const).map((value) => ({ value, label: words.motions[value] }))}
        onChange={(reducedMotion) => store.changeSettings({ reducedMotion })}
      />
    </Dialog>
  );
}
