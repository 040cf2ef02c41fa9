/** The demo builds, gains and scenes that come with the program, from scenes/; the one place that reads them. */
import { parseBuild } from '../../craft/build.ts';
import { parseGains, type Gains } from '../../craft/gains.ts';
import { OPEN_FIELD, parseScene, type Scene } from '../../craft/scene.ts';
import { CALM } from '../../craft/wind.ts';
import { DEFAULT_SETTINGS, newCraft, type CraftWork, type WorkDocument } from './document.ts';

const files: Record<string, unknown> = import.meta.glob('/scenes/*.json', { eager: true, import: 'default' });

const FIRST_SCENE = 'estuary-bridge';

function filesOf(kind: string): [stem: string, raw: unknown][] {
  const ending = `.${kind}.json`;
  return Object.entries(files)
    .filter(([path]) => path.endsWith(ending))
    .map(([path, raw]) => [path.slice('/scenes/'.length, -ending.length), raw]);
}

/** Scenes that come with the program, the open field last. */
export function demoScenes(): Scene[] {
  return [...filesOf('scene').map(([stem, raw]) => parseScene(raw, `${stem}.scene.json`)), OPEN_FIELD];
}

/** Builds that have gains beside them, as crafts. */
export function demoCrafts(): CraftWork[] {
  const gains = new Map<string, Gains>(
    filesOf('gains').map(([stem, raw]) => [stem, parseGains(raw, `${stem}.gains.json`)]),
  );
  return filesOf('build').flatMap(([stem, raw]) => {
    const own = gains.get(stem);
    return own === undefined ? [] : [newCraft(parseBuild(raw, `${stem}.build.json`), own)];
  });
}

/** What a newcomer finds: the demo crafts, the first one on the desk, at the bridge on a calm day. */
export function firstDocument(): WorkDocument {
  const crafts = demoCrafts();
  const scenes = demoScenes();
  return {
    crafts,
    desk: {
      currentId: crafts[0].id,
      side: 'A',
      place: 'fly',
      wind: CALM,
      scene: scenes.find((scene) => scene.name === FIRST_SCENE) ?? scenes[0],
    },
    settings: DEFAULT_SETTINGS,
  };
}
