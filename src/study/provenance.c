/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * provenance.json: what was run on what.  No clock and no host name, so that
 * the same inputs give the same bytes.
 */
#include "study/provenance.h"

#include <sha2.h>

#include "report/json.h"
#include "study/measured.h"

static json_t *input_hashes(const mho_study *study, mho_status *status, mho_error *error)
{
  json_t *list = json_array();
  for (int i = 0; i < study->input_count; i++) {
    char digest[SHA256_DIGEST_STRING_LENGTH];
    if (!SHA256File(study->input[i].path, digest)) {
      *status = mho_fail_at(error, MHO_ERR_FILE, "study", study->input[i].path, 0, 0, NULL,
                            "cannot be read again");
      break;
    }
    json_t *item = json_object();
    item = mho_json_with(item, "file", mho_json_text(study->input[i].name));
    item = mho_json_with(item, "sha256", mho_json_text(digest));
    list = mho_json_append(list, item);
  }
  return list;
}

static json_t *molecule_parameters(const mho_molecule *molecule)
{
  char fermi[64];
  json_t *object = json_object();
  object = mho_json_with(object, "molecule", mho_json_text(molecule->name));
  object = mho_json_with(object, "parameters",
                      mho_json_text(mho_parameters_name(molecule->parameters)));
  object = mho_json_with(object, "source",
                      mho_json_text(mho_parameters_source(molecule->parameters)));
  object = mho_json_with(object, "beta_eV", json_real(molecule->beta_ev));
  object = mho_json_with(object, "temperature_K", json_real(molecule->temperature_k));
  for (int side = 0; side < 2; side++) {
    const mho_contact *contact = &molecule->contact[side];
    object = mho_json_with(object, side ? "coupling_right_eV" : "coupling_left_eV",
                           contact->has_chain ? json_null() : json_real(contact->coupling_ev));
    if (contact->has_chain)
      object = mho_json_with(object, side ? "chain_right" : "chain_left",
                             mho_json_chain(&contact->chain));
  }
  object = mho_json_with(object, "fermi",
                      mho_json_text(mho_fermi_write(&molecule->fermi, fermi, sizeof fermi)));
  return object;
}

mho_status mho_write_provenance(const mho_study *study, const char *command, json_t *files,
                                mho_buffer *buffer, mho_error *error)
{
  mho_status status = MHO_OK;
  json_t *object = json_object(), *molecules = json_array();
  for (int i = 0; i < study->molecule_count; i++)
    molecules = mho_json_append(molecules, molecule_parameters(&study->molecule[i]));
  object = mho_json_with(object, "schema", mho_json_text(MHO_JSON_SCHEMA));
  object = mho_json_with(object, "mholecule", mho_json_text(mho_version()));
  object = mho_json_with(object, "command", command ? mho_json_text(command) : json_null());
  object = mho_json_with(object, "inputs", input_hashes(study, &status, error));
  object = mho_json_with(object, "molecules", molecules);
  object = mho_json_with(object, "window_eV", json_real(study->window_ev));
  object = mho_json_with(object, "files", files);
  /* Only the bootstrap over traces is random. */
  object = mho_json_with(object, "seed",
                         study->traces_count > 0 ? json_integer(MHO_STUDY_SEED) : json_null());
  if (status != MHO_OK) {
    json_decref(object);
    return status;
  }
  return mho_json_write(object, buffer, error);
}
