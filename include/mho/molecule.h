/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A molecule as the model sees it: pi sites, bonds, electrons and the two
 * contacts.  Readers fill it, mho_junction_build turns it into numbers.
 */
#ifndef MHOLECULE_MOLECULE_H
#define MHOLECULE_MOLECULE_H

#include <mho/graph.h>
#include <mho/parameters.h>
#include <mho/status.h>
#include <mho/torsion.h>

#define MHO_DEFAULT_BETA_EV (-2.7)
#define MHO_DEFAULT_TEMPERATURE_K 300.0
#define MHO_DEFAULT_COUPLING_EV 0.5

enum { MHO_ID_SIZE = 64, MHO_SITE_LIMIT = 5000 };

typedef struct {
  char id[MHO_ID_SIZE];
  int row;              /* of the parameter set; -1 for an explicit energy only */
  bool explicit_onsite; /* onsite_ev overrides h*beta */
  double onsite_ev;
  int electrons; /* that the site brings; 0 for an explicit energy only */
} mho_site;

typedef struct {
  int site[2];
  double strength;       /* factor on k of the table: bond alternation; usually 1 */
  bool explicit_hopping; /* hopping_ev overrides strength*k*beta */
  double hopping_ev;     /* untwisted */
  double twist_deg;      /* always multiplies: t = hopping * cos(twist) */
  bool rotatable;
  const char *torsion; /* kind: a name of mho_torsion_table, or NULL */
} mho_bond;

/* The torsion potential that a file gives. */
typedef struct {
  int bond; /* -1: of every bond without one of its own */
  char *name; /* as the file writes it */
  mho_torsion potential;
} mho_bond_torsion;

typedef enum {
  MHO_CHANNELS_INDEPENDENT, /* Gamma_ij = coupling * delta_ij on the sites */
  MHO_CHANNELS_ONE          /* Gamma = coupling * v v^T, v = amplitudes */
} mho_channels;

/* A semi-infinite chain as electrode, joined by a hopping V to the end of a
 * chain of hoppings t about the energy e: a semi-elliptic band,
 *   Sigma(E) = V^2 (x - sqrt(x^2 - 4t^2)) / (2t^2),  x = E - e,
 * so inside the band Gamma = V^2/t^2 sqrt(4t^2 - x^2) and shift = V^2 x/(2t^2);
 * outside it nothing is transmitted. */
typedef struct {
  double center_ev, hopping_ev; /* e, t != 0 */
  double joint_ev;              /* V */
} mho_chain_electrode;

/* A contact: Sigma = shift - i Gamma/2 on its sites, or a chain. */
typedef struct {
  int count;         /* sites; 0 while the molecule has no such contact */
  int *site;         /* [count] */
  double *amplitude; /* [count], used by MHO_CHANNELS_ONE */
  double coupling_ev; /* Gamma, the full width */
  double shift_ev;    /* real part of the self-energy */
  mho_channels channels;
  bool has_chain; /* each channel has such a chain instead of coupling and shift */
  mho_chain_electrode chain;
  long line, column; /* where the file gives the chain; 0 elsewhere */
} mho_contact;

typedef enum {
  MHO_FERMI_ENERGY, /* offset_ev on the scale of alpha */
  MHO_FERMI_MIDGAP, /* centre of the frontier gap, offset_ev = 0 */
  MHO_FERMI_HOMO,   /* HOMO + offset_ev */
  MHO_FERMI_LUMO    /* LUMO + offset_ev */
} mho_fermi_kind;

typedef struct {
  mho_fermi_kind kind;
  double offset_ev;
  long line, column; /* where the file says so; 0 elsewhere */
} mho_fermi;

/* A linker by its kind (`amine`, `thiol` ...) and the site that binds. */
typedef struct {
  const char *kind;
  int site;
} mho_site_linker;

enum { MHO_LEFT, MHO_RIGHT };

typedef struct {
  char *name;
  char *source; /* file it was read from, or NULL */
  char *smiles; /* that a molecule file gives, or NULL */
  const mho_parameter_set *parameters;
  double beta_ev;
  double temperature_k;
  int site_count, bond_count;
  mho_site *site;
  mho_bond *bond;
  bool explicit_electrons;
  int electrons; /* in the pi system */
  int charge;
  mho_contact contact[2]; /* MHO_LEFT, MHO_RIGHT */
  mho_fermi fermi;
  int torsion_count;
  mho_bond_torsion *torsion;
  bool frozen; /* every junction keeps its angles: log G is averaged, not G */
  /* The structure that was drawn (no atoms where the file gives the sites
   * themselves), and [site_count] the atom of each site. */
  mho_graph graph;
  int *site_atom;
  /* What the reader of a structure has to say. */
  int linker_count;
  mho_site_linker *linker;
  mho_texts notes;
  unsigned warnings; /* bits of mho/warning.h */
  mho_parameter_set *own_parameters; /* of the file, if it names a set */
} mho_molecule;

/* Where a length comes from: nowhere (contacts missing, or no bonds between
 * them), the coordinates of a file, or the planar layout with bonds of 0.14
 * nm. */
typedef enum { MHO_LENGTH_NONE, MHO_LENGTH_COORDINATES, MHO_LENGTH_IDEALISED } mho_length_kind;

MHO_BEGIN_DECLARATIONS

/* An empty molecule with the defaults of this header; clear frees what it
 * owns and may be called on an empty one. */
MHO_API void mho_molecule_init(mho_molecule *molecule);
MHO_API void mho_molecule_clear(mho_molecule *molecule);

/* Index of a site, or -1. */
MHO_API int mho_molecule_find_site(const mho_molecule *molecule,
                                   const char *id);

/* Index of the bond between two sites that is written `C5-C8`, or -1. */
MHO_API int mho_molecule_find_bond(const mho_molecule *molecule,
                                   const char *text);

/* Energy of a site, and hopping of a bond with its twist, in eV. */
MHO_API double mho_molecule_onsite_ev(const mho_molecule *molecule, int site);
MHO_API double mho_molecule_hopping_ev(const mho_molecule *molecule, int bond);

/* Torsion potential of a bond and its name: of the file, else of its kind.
 * Errors: MHO_ERR_REFERENCE (neither is known). */
MHO_API MHO_MUST_USE mho_status mho_molecule_torsion(const mho_molecule *molecule,
                                                     int bond,
                                                     mho_torsion *torsion,
                                                     const char **name,
                                                     mho_error *error);

/* Distance between the contacts (the centres of their atoms) in nm.
 * Errors: MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_molecule_length(const mho_molecule *molecule,
                                                    double *length_nm,
                                                    mho_length_kind *kind);

/* Adds MHO_WARN_LONG to molecule->warnings where that exceeds 4 nm; cheap for
 * short molecules.  Errors: MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_molecule_warn_length(mho_molecule *molecule);

/* cos of an angle in degrees, exact at multiples of 90 and 60 degrees. */
MHO_API double mho_cos_deg(double angle_deg);

/* The same of many angles, within 2e-16 of it; the arrays may be one. */
MHO_API void mho_cos_deg_many(size_t count, const double *angle_deg, double *cosine);

MHO_END_DECLARATIONS

#endif
