/** Files that come in by drop or picker: what they are is read from them, not from their names. */
import { BUILD_FORMAT, parseBuild } from '../../craft/build.ts';
import { LARGEST_JSON_BYTES } from '../../craft/fields.ts';
import { GAINS_FORMAT, parseGains } from '../../craft/gains.ts';
import { InputError, refuse } from '../../craft/problem.ts';
import { parseScene, SCENE_FORMAT } from '../../craft/scene.ts';
import { parseWind, WIND_FORMAT } from '../../craft/wind.ts';
import { newCraft } from '../store/document.ts';
import type { Store } from '../store/store.ts';
import { parseGuardedJson } from './guardedJson.ts';

/** Logs are long; beyond this a browser tab runs out of memory. */
const LARGEST_FILE_BYTES = 500_000_000;

/**
 * Opens a build, gains, wind, scene or archive file, or hands a table (CSV) to Match. What cannot be used is
 * told in a notice and changes nothing. Resolves to whether it was taken.
 */
export async function openFile(store: Store, file: File): Promise<boolean> {
  try {
    if (file.size > LARGEST_FILE_BYTES)
      throw refuse(file.name, '', `${file.size} bytes`, `at most ${LARGEST_FILE_BYTES} bytes`);
    const head = new Uint8Array(await file.slice(0, 4).arrayBuffer());
    if (head[0] === 0x50 && head[1] === 0x4b) {
      // "PK": a zip file.
      const { readArchive } = await import('./archive.ts');
      const crafts = readArchive(new Uint8Array(await file.arrayBuffer()), file.name);
      store.addCrafts(crafts, store.texts.edits.import(file.name));
      store.notices.tell('info', store.texts.archive.opened(crafts.length));
    } else if (await looksLikeTable(file)) {
      store.offerFile('match', file);
    } else {
      if (file.size > LARGEST_JSON_BYTES) {
        throw refuse(file.name, '', `${file.size} bytes`, `at most ${LARGEST_JSON_BYTES} bytes of JSON`);
      }
      openJson(store, parseGuardedJson(await file.text(), file.name), file.name);
    }
    store.notices.settle(`input:${file.name}`);
    return true;
  } catch (error) {
    if (error instanceof InputError) store.tellInputError(error);
    else store.notices.tell('error', store.texts.notices.refused(file.name), { details: [String(error)] });
    return false;
  }
}

/** JSON begins with a brace or bracket; a table does not. */
async function looksLikeTable(file: File): Promise<boolean> {
  const start = (await file.slice(0, 256).text()).replace(/^\uFEFF/, '').trimStart();
  return (
    /\.(csv|txt|tsv)$/i.test(file.name) || (start !== '' && !/^[{[]/.test(start) && /^[#"\w]/.test(start))
  );
}

function openJson(store: Store, raw: unknown, file: string): void {
  const format = (raw as { format?: unknown } | null)?.format;
  const label = store.texts.edits.openFile(file);
  switch (format) {
    case BUILD_FORMAT: {
      const build = parseBuild(raw, file);
      // A build alone has no gains yet: it starts with those on the desk, to be changed.
      store.addCrafts([newCraft(build, store.gains.value)], label);
      store.notices.tell('info', store.texts.work.newBuild(build.name, store.texts.places.shape));
      break;
    }
    case GAINS_FORMAT:
      store.openGains(parseGains(raw, file), label);
      break;
    case WIND_FORMAT:
      store.setWind(parseWind(raw, file), label);
      break;
    case SCENE_FORMAT:
      store.setScene(parseScene(raw, file), label);
      break;
    default:
      throw refuse(
        file,
        'format',
        format,
        `"${BUILD_FORMAT}", "${GAINS_FORMAT}", "${WIND_FORMAT}" or "${SCENE_FORMAT}"`,
      );
  }
}
