/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * provenance.json: what was run on what.  No clock and no host name, so that
 * the same inputs give the same bytes.
 */
#include "study/provenance.h"

#include <sha2.h>

#include "report/json.h"

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
    json_object_set_new(item, "file", json_string(study->input[i].name));
    json_object_set_new(item, "sha256", json_string(digest));
    json_array_append_new(list, item);
  }
  return list;
}

static json_t *molecule_parameters(const mho_molecule *molecule)
{
  char fermi[64];
  json_t *object = json_object();
  json_object_set_new(object, "molecule", json_string(molecule->name));
  json_object_set_new(object, "parameters",
                      json_string(mho_parameters_name(molecule->parameters)));
  json_object_set_new(object, "source",
                      json_string(mho_parameters_source(molecule->parameters)));
  json_object_set_new(object, "beta_eV", json_real(molecule->beta_ev));
  json_object_set_new(object, "temperature_K", json_real(molecule->temperature_k));
  json_object_set_new(object, "coupling_left_eV",
                      json_real(molecule->contact[MHO_LEFT].coupling_ev));
  json_object_set_new(object, "coupling_right_eV",
                      json_real(molecule->contact[MHO_RIGHT].coupling_ev));
  json_object_set_new(object, "fermi",
                      json_string(mho_fermi_write(&molecule->fermi, fermi, sizeof fermi)));
  return object;
}

mho_status mho_write_provenance(const mho_study *study, const char *command,
                                mho_buffer *buffer, mho_error *error)
{
  mho_status status = MHO_OK;
  json_t *object = json_object(), *molecules = json_array();
  for (int i = 0; i < study->molecule_count; i++)
    json_array_append_new(molecules, molecule_parameters(&study->molecule[i]));
  json_object_set_new(object, "schema", json_string(MHO_JSON_SCHEMA));
  json_object_set_new(object, "mholecule", json_string(mho_version()));
  json_object_set_new(object, "command", command ? json_string(command) : json_null());
  json_object_set_new(object, "inputs", input_hashes(study, &status, error));
  json_object_set_new(object, "molecules", molecules);
  json_object_set_new(object, "window_eV", json_real(study->window_ev));
  json_object_set_new(object, "seed", json_null()); /* nothing here is random */
  if (status != MHO_OK) {
    json_decref(object);
    return status;
  }
  return mho_json_write(object, buffer, error);
}
