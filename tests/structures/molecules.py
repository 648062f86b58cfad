# SPDX-License-Identifier: GPL-3.0-or-later
"""About 2000 molecules for the tests of structures: a collection of known
ones, and random chains of rings, bridges, substituents and linkers.  The same
list on every machine (fixed seed)."""
import random

KNOWN = """
c1ccccc1 C1=CC=CC=C1 c1ccc2ccccc2c1 c1ccc2cc3ccccc3cc2c1 c1ccc2c(c1)ccc1ccccc12
c1ccc2cc3cc4ccccc4cc3cc2c1 c1cc2ccc3cccc4ccc(c1)c2c34 c1ccc2c(c1)c1ccccc1c1ccccc21
c1cc2cccc3c4cccc5cccc(c(c1)c23)c45 c1ccc2cccc-2cc1 C=C1C=CC=C1 c1ccc2c(c1)-c1cccc3cccc-2c13
C1=Cc2cccc3cccc1c23 C=C C=CC=C C=CC=CC=C C#C C#CC#C C=C=C C=C=C=C CC#N C=C=O O=C=O
c1ccncc1 c1ccnnc1 c1cnccn1 c1cncnc1 c1ncncn1 c1nnncn1 c1cc[nH]c1 c1ccoc1 c1ccsc1 c1cc[se]c1
c1c[nH]cn1 c1cn[nH]c1 c1cnoc1 c1cocn1 c1cscn1 c1cnsc1 c1nnn[nH]1 c1nc[nH]n1 c1cnn[nH]1
c1ccc2[nH]ccc2c1 c1ccc2occc2c1 c1ccc2sccc2c1 c1ccc2ncccc2c1 c1ccc2cnccc2c1 c1ccc2nccnc2c1
c1ccc2nc3ccccc3cc2c1 c1ccc2nc3ccccc3nc2c1 c1ccc2c(c1)[nH]c1ccccc12 c1ccc2c(c1)oc1ccccc12
c1ccc2c(c1)sc1ccccc12 c1ncc2[nH]cnc2n1 c1ccn2cccc2c1 c1ccc2nsnc2c1 c1ccc2nonc2c1
Cn1c(=O)c2c(ncn2C)n(C)c1=O Nc1ncnc2[nH]cnc12 O=c1cc[nH]c(=O)[nH]1 O=c1ccccn1C O=c1ccocc1
O=C1C=CC(=O)C=C1 O=C1c2ccccc2C(=O)c2ccccc12 Oc1c2ccccc2c(O)c2ccccc12 N=C1C=CC(=N)C=C1
O=C1C=CC=CC=C1 O=C1C=CC=C1 S=C1C=CC=CC=C1 C1=CC=CC=CC=C1 C1=CC=C1 c1ccc2ccc2c1
S1C=CSC1=C1SC=CS1 c1sc2ccsc2c1 c1cc2sc3ccsc3c2s1 O=c1[nH]c(=O)c2ccccc12
c1cc2cc3ccc(cc4ccc(cc5ccc(cc1n2)[nH]5)n4)[nH]3 C1=CC2=CC3=CC=C(N3)C=C4C=CC(=N4)C=C5C=CC(=CC1=N2)N5
c1ccc(cc1)N(c1ccccc1)c1ccccc1 c1ccc(cc1)Nc1ccccc1 c1ccc(cc1)Oc1ccccc1 c1ccc(cc1)Sc1ccccc1
c1ccc(cc1)N=Nc1ccccc1 c1ccc(cc1)C=Nc1ccccc1 c1ccc(cc1)/C=C/c1ccccc1 c1ccc(cc1)C#Cc1ccccc1
c1ccc(cc1)C(=O)c1ccccc1 c1ccc(cc1)C(=C)c1ccccc1 c1ccc(cc1)-n1cccc1 c1ccc(cc1)-n1c2ccccc2c2ccccc12
[O-][n+]1ccccc1 O=[N+]([O-])c1ccccc1 C[N+](=O)[O-] CC(C)=[N+](C)[O-] [O-][n+]1cccc2ccccc12
C[n+]1ccccc1 c1cc[nH+]cc1 C[n+]1ccn(C)c1 [nH+]1cc[nH]c1 c1cc[o+]cc1 c1cc[s+]cc1
[CH+]1C=CC=CC=C1 [cH+]1cccccc1 c1cc[cH-]c1 [CH-]1C=CC=C1 C=C[CH2+] C=C[CH2-] [CH2]C=C
[O-]c1ccccc1 [S-]c1ccccc1 C[NH+]=C CC(=O)[O-] CC(=O)NC NC(=N)N NC(=O)N CC(=S)N NC(=[NH2+])N
[NH3+]c1ccccc1 C[N+](C)(C)c1ccccc1 CC(=O)O CC(=O)OC CC(=O)Cl CS(C)=O CS(C)(=O)=O CP(C)(C)=O
FC(F)(F)c1ccccc1 Fc1c(F)c(F)c(F)c(F)c1F Clc1ccccc1 Brc1ccccc1 Ic1ccccc1 C[Si](C)(C)C#Cc1ccccc1
c1ccc(cc1)B(c1ccccc1)c1ccccc1 OB(O)c1ccccc1 b1ccccc1 B1C=CC=C1 p1ccccc1 c1cc[pH]c1 CP(C)c1ccccc1
F[B-](F)(F)F F[P-](F)(F)(F)(F)F [Na+].[Cl-] [H][H] [H]c1ccccc1 [2H]c1ccccc1 [13CH4] [NH4+] O
C1CCCCC1 C1CC1 C12C3C4C1C5C2C3C45 C1CC2CCC1C2 N1CCOCC1 CCO CCCCCCCC CC(C)(C)C
N[C@@H](C)C(=O)O N[C@H](C)C(=O)O F/C=C/F F/C=C\\F OC1=CC=CC=C1 C1=CC2=C(C=C1)C=CC=C2
[nH]1cccc1 n1(C)cccc1 o1cccc1 [se]1cccc1 [te]1cccc1 c1cc[as]cc1 c1ccc2[nH]c3ccccc3c2c1
O=S(=O)(c1ccccc1)c1ccccc1 CN(C)c1ccc(cc1)N(C)C Nc1ccc(N)cc1 Sc1ccc(S)cc1 Nc1cccc(N)c1
Nc1ccc(Nc2ccc(N)cc2)cc1 N=C1C=CC(=Nc2ccccc2)C=C1 CC(=O)Sc1ccc(SC(C)=O)cc1 SCc1ccc(CS)cc1
n1ccc(cc1)-c1ccncc1 n1ccc(cc1)C#Cc1ccncc1 n1ccc(cc1)C=Cc1ccncc1 n1ccc(cc1)C#CC#Cc1ccncc1
N#Cc1ccc(C#N)cc1 N#CC(C#N)=C1C=CC(=C(C#N)C#N)C=C1 N#CC(C#N)=C(C#N)C#N [C-]#[N+]c1ccc([N+]#[C-])cc1
c1ccc(s1)-c1cccs1 c1ccc(s1)-c1ccc(s1)-c1cccs1 O=C1C(=O)c2ccccc12 O=C1OC(=O)C=C1 O=C1NC(=O)C=C1
c1ccc2c(c1)C=Cc1ccccc1N2 c1ccc2c(c1)Cc1ccccc12 C1c2ccccc2-c2ccccc12 C1Cc2ccccc2-c2ccccc12
O=C1c2ccccc2-c2ccccc12 c1ccc2c(c1)-c1ccccc1-2 c1cc2ccccc2cc1-c1ccc2ccccc2c1 CN=[N+]=[N-]
C=[N+]=[N-] ON=Cc1ccccc1 NNc1ccccc1 c1ccc(cc1)SSc1ccccc1 CSc1ccc(SC)cc1 S=C(N)c1ccccc1
O=c1c2ccccc2[nH]c2ccccc12 O=c1ccc2ccccc2o1 [O]c1ccccc1 CC(C)(C)N([O])c1ccccc1 [CH2]c1ccccc1
c1cc2ccc3ccc4ccc5ccc6ccc1c1c2c3c4c5c61 c1ccc2c(c1)c1ccccc1c1c2c2ccccc2c2ccccc12 N1=CC=NC=C1
""".split()

# Bivalent pieces; {r} is the rest of the chain, {a} and {b} ring numbers.
PIECES = """
c{a}ccc({r})cc{a} c{a}cccc({r})c{a} c{a}ccccc{a}{r} c{a}ccc({r})s{a} c{a}ccc({r})o{a}
c{a}ccc({r})[nH]{a} c{a}ccc({r})n{a}C c{a}ccc({r})nc{a} c{a}cnc({r})nc{a} c{a}nnc({r})nn{a}
c{a}csc({r})c{a} c{a}nnc({r})o{a} c{a}nc({r})cs{a} n{a}ccc({r})c{a} c{a}cc({r})[nH]n{a}
c{a}ccc{b}cc({r})ccc{b}c{a} c{a}ccc({r})c{b}ccccc{a}{b} c{a}cccc{b}c({r})cccc{a}{b}
c{a}c{b}ccccc{b}c({r})c{b}ccccc{a}{b} c{a}ccc{b}c(c{a})Cc{a}cc({r})ccc{b}{a}
c{a}cc{b}[nH]c({r})cc{b}cc{a} c{a}cc{b}sc({r})cc{b}s{a} c{a}cc{b}ncc({r})nc{b}cc{a}
c{a}c(C)cc({r})cc{a}C c{a}c(F)c(F)c({r})c(F)c{a}F c{a}cc(OC)c({r})cc{a}OC c{a}cc([N+](=O)[O-])c({r})cc{a}
C=C{r} /C=C/{r} C#C{r} C#CC#C{r} N=N{r} /N=N/{r} C=N{r} N=C{r} C(=O){r} NC(=O){r} C(=O)N{r}
C(=C){r} C(=O)C=C{r} N{r} N(C){r} O{r} S{r} CC{r} C{r} C{a}=CC(=O)C({r})=CC{a}=O C(C#N)=C{r}
C{a}=CC=C({r})C=C{a} C{a}=CSC({r})=C{a} C(C(F)(F)F)=C{r} [Si](C)(C){r} B(c{a}ccccc{a}){r}
C=CC=C{r} C=C=C=C{r} c{a}c[n+]([O-])c({r})cc{a} c{a}ccc({r})c{b}nsnc{a}{b} C{a}=CC(=C{r})C=C{a}
c{a}ccc{b}c(c{a})c(=O)c{a}cc({r})ccc{a}[nH]{b} C{a}CCC({r})CC{a} P(C){r}
""".split()

ENDS = """N N S S SC SC(C)=O C#N C#C [N+]#[C-] C(=O)O [N+](=O)[O-] [S-] NC N(C)C O OC F Cl C C(C)(C)C
C(F)(F)F C=O C(N)=O c{a}ccncc{a} c{a}ccccn{a} c{a}ccccc{a} C[NH3+] [NH3+] CN CS C(=O)[O-]""".split()


def chain(rng):
    """One random chain, linker to linker, as SMILES."""
    number = [10]

    def fill(piece, rest):
        labels = {"a": "", "b": ""}
        for label in labels:
            if "{" + label + "}" in piece:
                labels[label] = "%%%d" % number[0]
                number[0] += 1
        return piece.format(r=rest, **labels)

    rest = fill(rng.choice(ENDS), "")
    for _ in range(rng.randint(1, 4)):
        rest = fill(rng.choice(PIECES), rest)
    start = rng.choice(["N", "S", "CS", "CC(=O)S", "N#C", "C#C", "[C-]#[N+]", "OC(=O)", "C", "O",
                        "n1ccc(cc1)", "c1ccccc1", "F", "[S-]", "O=Cc1ccc(cc1)"])
    return start + rest


def molecules(count=2000, seed=1):
    from rdkit import Chem, RDLogger
    RDLogger.DisableLog("rdApp.*")
    rng = random.Random(seed)
    seen, result = set(), []

    def take(smiles):
        molecule = Chem.MolFromSmiles(smiles)
        if molecule is None:
            return False
        name = Chem.MolToSmiles(molecule)
        if name not in seen:
            seen.add(name)
            result.append(smiles)
        return True

    for smiles in KNOWN:
        if not take(smiles):
            raise SystemExit("not a molecule for the reference: " + smiles)
    while len(result) < count:
        take(chain(rng))
    return result


if __name__ == "__main__":
    print("\n".join(molecules()))
